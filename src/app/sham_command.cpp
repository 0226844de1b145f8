#include "app/commands.hpp"
#include "app/truth.hpp"
#include "base/refusal.hpp"
#include "journal/session_reader.hpp"
#include "recording/events_table.hpp"
#include "referee/scoring.hpp"
#include "sham/schedule.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <memory>

namespace millpond {
namespace {

struct CommonOptions {
    double sampling_hz = 0.0; ///< 0: not said
    ScheduleLimits limits;
    std::filesystem::path out;
    bool overwrite = false;
};

void add_limits(CLI::App& command, CommonOptions& options, const std::string& known_without = {}) {
    auto* sampling = command
                         .add_option("--sampling-hz", options.sampling_hz,
                                     "frames a second of the stream that will play the schedule" + known_without)
                         ->check(CLI::Range(1.0, 1e6));
    sampling->required(known_without.empty());
    command
        .add_option("--lockout-ms", options.limits.lockout_ms,
                    "lock-out of the session that will play it; a schedule that breaks it is refused")
        ->check(CLI::Range(0.0, 60000.0))
        ->capture_default_str();
    command
        .add_option("--max-pulses-per-second", options.limits.max_pulses_per_second,
                    "likewise; places that would be too many within one second are put off")
        ->check(CLI::Range(1U, 1000U))
        ->capture_default_str();
}

void add_making(CLI::App& command, CommonOptions& options, double& min_interval_ms, std::uint64_t& seed) {
    add_limits(command, options, "; a session folder says it itself");
    command
        .add_option("--min-interval-ms", min_interval_ms,
                    "shortest interval between two places; not below the lock-out")
        ->check(CLI::Range(0.0, 60000.0))
        ->capture_default_str();
    command.add_option("--seed", seed, "seed of the random numbers (xoshiro256++): the same seed, the same schedule")
        ->capture_default_str();
    command.add_option("--out", options.out, "schedule to write: an events table with trial_type scheduled")
        ->required();
    command.add_flag("--overwrite", options.overwrite, "replace --out where it exists");
}

Hertz rate_of(const CommonOptions& options) {
    if (options.sampling_hz == 0.0) {
        throw Refusal("--sampling-hz", "nothing", "the rate of the stream that will play the schedule");
    }
    return Hertz{options.sampling_hz};
}

Schedule triggers_of_session(const std::filesystem::path& folder, CommonOptions& options) {
    const SessionReader session(folder);
    if (options.sampling_hz != 0.0 && options.sampling_hz != session.rate().value) {
        throw Refusal("--sampling-hz", fmt::format("{}", options.sampling_hz),
                      fmt::format("the rate of {}, {}, or nothing", folder.string(), session.rate().value));
    }
    options.sampling_hz = session.rate().value;
    Schedule triggers;
    for (const auto& event : session.events()) {
        if (event.kind == EventKind::trigger) {
            triggers.push_back(event.sample);
        }
    }
    return triggers;
}

Schedule triggers_of_table(const std::filesystem::path& table, Hertz rate) {
    Schedule triggers;
    for (const auto& event : read_events_table(table, rate.value)) {
        if (event.trial_type != "trigger") {
            continue;
        }
        if (event.sample < 0 || std::abs(static_cast<double>(event.sample) - event.onset_s * rate.value) > 1.0) {
            throw Refusal(table.string() + ": sample", fmt::format("{} for {} s", event.sample, event.onset_s),
                          fmt::format("the events of a stream of {} Hz (--sampling-hz)", rate.value));
        }
        triggers.push_back(SampleIndex{static_cast<std::uint64_t>(event.sample)});
    }
    return triggers;
}

/// A session folder sets the sampling rate too.
Schedule triggers_of(const std::filesystem::path& events, CommonOptions& options) {
    auto triggers = std::filesystem::is_directory(events) ? triggers_of_session(events, options)
                                                          : triggers_of_table(events, rate_of(options));
    std::sort(triggers.begin(), triggers.end());
    if (triggers.empty()) {
        throw Refusal(events.string(), "no trigger", "the events of a session or dry run with triggers");
    }
    return triggers;
}

void print_intervals(const Schedule& schedule, Hertz rate) {
    std::vector<double> intervals;
    for (std::size_t i = 1; i < schedule.size(); ++i) {
        intervals.push_back(static_cast<double>(schedule[i] - schedule[i - 1]) / rate.value);
    }
    fmt::print("places      {}\n", schedule.size());
    if (intervals.empty()) {
        return;
    }
    const auto told = distribution(std::move(intervals));
    fmt::print("rate        {:.4f} /s from first to last\n", trigger_rate_per_s(schedule, rate, "schedule"));
    fmt::print("intervals   median {:.3f} s, least {:.3f} s, most {:.3f} s\n", told.median, told.least, told.most);
}

void check_min_interval(double min_interval_ms, const CommonOptions& options) {
    if (min_interval_ms < options.limits.lockout_ms) {
        throw Refusal(
            "--min-interval-ms", fmt::format("{}", min_interval_ms),
            fmt::format("at least --lockout-ms, {}: nearer places would be withheld", options.limits.lockout_ms));
    }
}

void finish(const MadeSchedule& made, const CommonOptions& options) {
    const Hertz rate{options.sampling_hz};
    if (made.places.empty()) {
        throw Refusal(options.out.string(), "a schedule without a single place", "a longer duration or a higher rate");
    }
    check_schedule(made.places, options.limits, rate, options.out.string());
    if (!options.overwrite && std::filesystem::exists(options.out)) {
        throw Refusal(options.out.string(), "a file that exists", "a new name, or --overwrite");
    }
    write_schedule(options.out, made.places, rate);
    print_intervals(made.places, rate);
    fmt::print("put off     {} places, by {:.1f} ms at most\n", made.put_off, made.longest_put_off_ms);
    fmt::print("schedule    {}\n", options.out.string());
}

void add_delayed(CLI::App& sham) {
    struct Options : CommonOptions {
        std::filesystem::path events;
        DelayedPlan plan;
    };
    auto options = std::make_shared<Options>();
    auto& command = *sham.add_subcommand(
        "delayed",
        "put each trigger of a session or dry run later by a fixed or random delay\n"
        "Places that come too near to those before are put off, never dropped: the number of pulses stays matched");
    command.add_option("EVENTS", options->events, "session folder, or events.tsv of a session or dry run")->required();
    command
        .add_option("--delay-least-ms", options->plan.least_ms, "shortest delay; equal to the longest: a fixed delay")
        ->check(CLI::Range(0.0, 60000.0))
        ->capture_default_str();
    command.add_option("--delay-most-ms", options->plan.most_ms, "longest delay; between them all are equally likely")
        ->check(CLI::Range(0.0, 60000.0))
        ->capture_default_str();
    add_making(command, *options, options->plan.min_interval_ms, options->plan.seed);
    add_example(command, "build/millpond sham delayed dry/events.tsv --sampling-hz 1250 --delay-least-ms 150 "
                         "--delay-most-ms 250 --out delayed.tsv");
    command.callback([options] {
        check_min_interval(options->plan.min_interval_ms, *options);
        options->plan.max_pulses_per_second = options->limits.max_pulses_per_second;
        const auto triggers = triggers_of(options->events, *options);
        fmt::print("triggers    {}\n", triggers.size());
        finish(delayed_schedule(triggers, options->plan, rate_of(*options)), *options);
    });
}

void add_rate_matched(CLI::App& sham) {
    struct Options : CommonOptions {
        std::filesystem::path like, keep_away_from;
        RateMatchedPlan plan;
    };
    auto options = std::make_shared<Options>();
    auto& command = *sham.add_subcommand(
        "rate-matched",
        "put places at random with a minimum interval (shifted exponential law), at a rate given or taken from\n"
        "the triggers of a session, from the first to the last of them");
    auto* rate_option = command.add_option("--rate-per-s", options->plan.rate_per_s, "places a second, on average")
                            ->check(CLI::Range(1e-6, 1000.0));
    auto* like_option =
        command.add_option("--like", options->like, "session folder or events.tsv whose triggers give the rate");
    rate_option->excludes(like_option);
    command
        .add_option("--duration-s", options->plan.duration_s, "length of the schedule from the stream's first frame")
        ->required()
        ->check(CLI::Range(1.0, 1e6));
    auto* away = command.add_option("--keep-away-from", options->keep_away_from,
                                    "events table: no place in its rows of trial_type ripple; only where the same\n"
                                    "recording is played again");
    command.add_option("--keep-away-ms", options->plan.keep_away_ms, "nor this long before and after them")
        ->check(CLI::Range(0.0, 60000.0))
        ->needs(away)
        ->capture_default_str();
    add_making(command, *options, options->plan.min_interval_ms, options->plan.seed);
    add_example(command, "build/millpond sham rate-matched --rate-per-s 0.6 --duration-s 3600 --sampling-hz 1250 "
                         "--out rate_matched.tsv");
    command.callback([options, rate_option, like_option] {
        check_min_interval(options->plan.min_interval_ms, *options);
        if (rate_option->count() + like_option->count() == 0) {
            throw Refusal("command line", "neither --rate-per-s nor --like", "one of the two");
        }
        if (like_option->count() > 0) {
            const auto triggers = triggers_of(options->like, *options);
            options->plan.rate_per_s = trigger_rate_per_s(triggers, rate_of(*options), options->like.string());
            fmt::print("rate of     {}: {:.4f} /s\n", options->like.string(), options->plan.rate_per_s);
        }
        const Hertz rate = rate_of(*options);
        if (!options->keep_away_from.empty()) {
            options->plan.keep_away_from = ripples_from_table(options->keep_away_from, rate, UINT64_MAX);
        }
        options->plan.max_pulses_per_second = options->limits.max_pulses_per_second;
        finish(rate_matched_schedule(options->plan, rate), *options);
    });
}

void add_check(CLI::App& sham) {
    struct Options : CommonOptions {
        std::filesystem::path schedule;
    };
    auto options = std::make_shared<Options>();
    auto& command =
        *sham.add_subcommand("check", "read a schedule as a session would and refuse one that breaks the limits");
    command.add_option("SCHEDULE", options->schedule, "schedule to check")->required();
    add_limits(command, *options);
    add_example(command, "build/millpond sham check rate_matched.tsv --sampling-hz 1250");
    command.callback([options] {
        const Hertz rate{options->sampling_hz};
        const auto schedule = read_schedule(options->schedule, rate);
        check_schedule(schedule, options->limits, rate, options->schedule.string());
        print_intervals(schedule, rate);
    });
}

} // namespace

void add_sham_command(CLI::App& program) {
    auto& sham = *program.add_subcommand("sham", "make a control schedule: pulses that do not follow detections");
    sham.require_subcommand(1);
    add_example(sham, "build/millpond sham rate-matched --rate-per-s 0.6 --duration-s 3600 --sampling-hz 1250 "
                      "--out rate_matched.tsv");
    add_delayed(sham);
    add_rate_matched(sham);
    add_check(sham);
}

} // namespace millpond
