// millpond sham: control schedules, made and checked.
#include "app/commands.hpp"
#include "app/sham_options.hpp"
#include "app/truth.hpp"
#include "base/refusal.hpp"
#include "sham/rate_matched.hpp"
#include "sham/yoked.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <cmath>
#include <cstdio>
#include <memory>

namespace millpond {
namespace {

// A minimum interval below the lock-out would be refused place by place.
double min_interval_ms(std::optional<double> asked, const ScheduleLimits& limits) {
    if (asked && *asked < limits.lockout_ms) {
        throw Refusal("--min-interval-ms", fmt::format("{}", *asked),
                      fmt::format("at least the lock-out, {}: nearer places would have no pulse", limits.lockout_ms));
    }
    return asked.value_or(limits.lockout_ms);
}

struct MakingOptions : ShamOptions {
    std::optional<double> start_s, duration_s, min_interval;
    std::optional<std::uint64_t> seed;
};

void add_making(CLI::App& command, MakingOptions& options) {
    command
        .add_option("--start-s", options.start_s,
                    "where the schedule begins, from the first sample of the stream that plays it (else 0);\n"
                    "places before the floor has settled or before you arm have no pulse")
        ->check(CLI::Range(0.0, 1e6));
    command.add_option("--seed", options.seed, "of the draws: the same seed, the same schedule (else 1)");
    command
        .add_option("--min-interval-ms", options.min_interval,
                    "shortest interval between two places, not below the lock-out (else the lock-out)")
        ->check(CLI::Range(0.0, 60000.0));
    options.add_limits(command);
    options.add_out(command);
}

std::string line(const char* name, const std::string& said) {
    return fmt::format("{:<11} {}\n", name, said);
}

void print(const std::string& text) {
    std::fwrite(text.data(), 1, text.size(), stdout);
}

struct YokedOptions : MakingOptions {
    std::filesystem::path session;
    std::string align = "first";
    double least_delay_ms = 0.0, most_delay_ms = 0.0;
};

void make_yoked(YokedOptions& options) {
    options.take_source(options.session);
    const auto& source = *options.source();
    const auto rate = options.rate();
    YokedPlan plan;
    plan.moment = moment_of(source, options.align);
    plan.start_s = options.start_s.value_or(0.0);
    plan.duration_s = options.duration_s.value_or(0.0);
    plan.least_delay_ms = options.least_delay_ms;
    plan.most_delay_ms = options.most_delay_ms;
    plan.seed = options.seed.value_or(1);
    plan.min_interval_ms = min_interval_ms(options.min_interval, options.limits());
    plan.max_pulses_per_second = options.limits().max_pulses_per_second;
    plan.max_pulses_per_minute = options.limits().max_pulses_per_minute;
    const auto made = yoked_schedule(source.places, plan, rate);
    const SampleIndex start{static_cast<std::uint64_t>(std::llround(plan.start_s * rate.value))};
    const auto written = options.write(made);
    print(line("source", source.told()) +
          line("aligned",
               fmt::format("{} ({:.3f} s of it) at {:.3f} s; left out: {} places before it, {} after the "
                           "duration",
                           options.align, seconds_at(plan.moment, rate), plan.start_s, made.before, made.after)) +
          options.report(made.places, plan.moment, start) + written);
}

void add_yoked(CLI::App& sham) {
    auto options = std::make_shared<YokedOptions>();
    auto& command = *sham.add_subcommand(
        "yoked", "take the places from another session: the pulses that it gave (its orders), else its triggers\n"
                 "To the sample, unless a delay is asked for: then places that come too near to each other are put\n"
                 "off, never dropped");
    command.add_option("SOURCE", options->session, "session folder, or events.tsv of a session or dry run")->required();
    command
        .add_option("--align", options->align,
                    "moment of the source that --start-s stands for: first (its first sample), armed (when it was\n"
                    "first armed), or the name of an epoch of its plan")
        ->capture_default_str();
    command
        .add_option("--duration-s", options->duration_s,
                    "cut the schedule so long after that moment (else as long as the source)")
        ->check(CLI::Range(1e-3, 1e6));
    command.add_option("--delay-least-ms", options->least_delay_ms, "shortest delay of each place")
        ->check(CLI::Range(0.0, 60000.0))
        ->capture_default_str();
    command
        .add_option("--delay-most-ms", options->most_delay_ms,
                    "longest; between the two all are equally likely, equal: a fixed delay")
        ->check(CLI::Range(0.0, 60000.0))
        ->capture_default_str();
    add_making(command, *options);
    options->add_ripples(command, "of the source");
    add_example(command,
                "build/millpond sham yoked dry/events.tsv --sampling-hz 1250 --duration-s 600 --out yoked.tsv");
    command.callback([options] { make_yoked(*options); });
}

struct RateMatchedOptions : MakingOptions {
    std::filesystem::path like, keep_away_from;
    std::optional<double> rate_per_s;
    double keep_away_ms = 0.0;
};

// What is not given, the settings say, where there are some.
RateMatchedPlan plan_of(const RateMatchedOptions& options) {
    RateMatchedPlan plan;
    const auto* said = options.settings() ? &options.settings()->schedule : nullptr;
    const auto from_settings = [&](double ScheduleSettings::*key) {
        return said != nullptr ? std::optional(said->*key) : std::nullopt;
    };
    const auto& source = options.source();
    const auto rate_per_s = options.rate_per_s ? options.rate_per_s
                            : source ? std::optional(rate_per_s_of(source->places, source->rate, source->name))
                                     : from_settings(&ScheduleSettings::rate_per_s);
    const auto duration_s = options.duration_s ? options.duration_s : from_settings(&ScheduleSettings::duration_s);
    if (!rate_per_s) {
        throw Refusal("command line", "neither --rate-per-s nor --like nor --settings", "one of them");
    }
    if (!duration_s) {
        throw Refusal("--duration-s", "nothing", "the length of the schedule, or --settings");
    }
    auto asked = options.min_interval;
    if (!asked && said != nullptr && said->min_interval_ms > 0.0) {
        asked = said->min_interval_ms;
    }
    plan.rate_per_s = *rate_per_s;
    plan.duration_s = *duration_s;
    plan.start_s = options.start_s.value_or(said != nullptr ? said->start_s : 0.0);
    plan.seed = options.seed.value_or(said != nullptr ? said->seed : 1);
    plan.min_interval_ms = min_interval_ms(asked, options.limits());
    plan.max_pulses_per_second = options.limits().max_pulses_per_second;
    plan.max_pulses_per_minute = options.limits().max_pulses_per_minute;
    plan.keep_away_ms = options.keep_away_ms;
    return plan;
}

void make_rate_matched(RateMatchedOptions& options) {
    if (!options.like.empty()) {
        options.take_source(options.like);
    }
    auto plan = plan_of(options);
    const auto rate = options.rate();
    if (!options.keep_away_from.empty()) {
        plan.keep_away_from = ripples_from_table(options.keep_away_from, rate, UINT64_MAX);
        if (!options.has_ripples()) {
            options.take_ripples(options.keep_away_from);
        }
    }
    const auto made = rate_matched_schedule(plan, rate);
    const auto written = options.write(made);
    const auto& source = options.source();
    print((source ? line("source", source->told()) : "") +
          line("asked", fmt::format("{:.4f} /s for {} s from {} s on: {:.0f} places expected, no two nearer than {} ms",
                                    plan.rate_per_s, plan.duration_s, plan.start_s, plan.rate_per_s * plan.duration_s,
                                    plan.min_interval_ms)) +
          options.report(made.places) + written);
}

void add_rate_matched(CLI::App& sham) {
    auto options = std::make_shared<RateMatchedOptions>();
    auto& command = *sham.add_subcommand(
        "rate-matched", "put places at random with a minimum interval (shifted exponential law), at a rate that is\n"
                        "given, or that of another session from its first pulse to its last, or that of a settings "
                        "file");
    auto* rate = command
                     .add_option("--rate-per-s", options->rate_per_s,
                                 "places a second, on average (else schedule.rate_per_s of --settings)")
                     ->check(CLI::Range(1e-6, 1000.0));
    command
        .add_option("--like", options->like,
                    "session folder or events.tsv whose pulses (orders, else triggers) give the rate")
        ->excludes(rate);
    command
        .add_option("--duration-s", options->duration_s,
                    "length of the schedule, from --start-s on (else schedule.duration_s of --settings)")
        ->check(CLI::Range(1.0, 1e6));
    auto* away = command.add_option("--keep-away-from", options->keep_away_from,
                                    "events table: no place in its rows of trial_type ripple; only where the same\n"
                                    "recording is played again. Live, places wait (arbiter.hold)");
    command.add_option("--keep-away-ms", options->keep_away_ms, "nor this long before and after them")
        ->check(CLI::Range(0.0, 60000.0))
        ->needs(away)
        ->capture_default_str();
    add_making(command, *options);
    options->add_ripples(command, "of the stream that plays it, or of one like it");
    add_example(command, "build/millpond sham rate-matched --rate-per-s 0.6 --duration-s 3600 --sampling-hz 1250 "
                         "--out rate_matched.tsv");
    command.callback([options] { make_rate_matched(*options); });
}

void add_check(CLI::App& sham) {
    struct Options : ShamOptions {
        std::filesystem::path schedule, session;
    };
    auto options = std::make_shared<Options>();
    auto& command = *sham.add_subcommand(
        "check", "read a schedule as a session would, say what it amounts to, and refuse one that breaks the limits");
    command.add_option("SCHEDULE", options->schedule, "schedule to check")->required();
    command.add_option("--source", options->session,
                       "session folder or events.tsv to compare its intervals with: the pulses, else the triggers");
    options->add_limits(command);
    options->add_ripples(command, "of the stream that plays it, or of one like it");
    add_example(command, "build/millpond sham check rate_matched.tsv --sampling-hz 1250");
    command.callback([options] {
        if (!options->session.empty()) {
            options->take_source(options->session);
        }
        const auto rate = options->rate();
        const auto schedule = read_schedule(options->schedule, rate);
        check_schedule(schedule, options->limits(), rate, options->schedule.string());
        print((options->source() ? line("source", options->source()->told()) : "") + options->report(schedule));
    });
}

} // namespace

void add_sham_command(CLI::App& program) {
    auto& sham = *program.add_subcommand("sham", "make a control schedule: pulses that do not follow detections");
    sham.require_subcommand(1);
    add_example(sham, "build/millpond sham rate-matched --rate-per-s 0.6 --duration-s 3600 --sampling-hz 1250 "
                      "--out rate_matched.tsv");
    add_yoked(sham);
    add_rate_matched(sham);
    add_check(sham);
}

} // namespace millpond
