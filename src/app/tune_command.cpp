#include "app/commands.hpp"
#include "app/dry_run_tables.hpp"
#include "app/progress.hpp"
#include "app/stop_signals.hpp"
#include "app/tune_learn.hpp"
#include "app/tune_plan.hpp"
#include "app/tune_tables.hpp"
#include "base/refusal.hpp"
#include "recording/whole_file.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <memory>

namespace millpond {
namespace {

constexpr int stopped_status = 130; // as shells call the end by Ctrl-C

Settings tuned(Settings settings, const DetectorSettings& picked, const TunePlan& plan, bool without_base) {
    settings.detector = picked;
    settings.detector.floor.warm_start_session.clear(); // floors of another filter would be wrong
    if (settings.channels.empty()) {
        settings.channels = plan.recordings.front().channels;
    }
    if (without_base) {
        settings.stream.source = SourceKind::pipe;
        settings.stream.encoding = SampleEncoding::float32;
        settings.stream.rate_hz = plan.sweep.rate.value;
        settings.stream.channels = static_cast<std::uint32_t>(settings.channels.size());
    }
    return settings;
}

// Read back under its unfinished name: what a session would refuse never gets the name asked for.
void write_settings(const Settings& settings, const std::filesystem::path& out) {
    auto unchecked = out;
    unchecked += ".unchecked";
    write_whole_file(unchecked, settings_to_yaml(settings));
    try {
        static_cast<void>(load_settings(unchecked));
    } catch (...) {
        std::filesystem::remove(unchecked);
        throw;
    }
    std::filesystem::rename(unchecked, out);
}

std::string part_summary(const char* part, const PartFigures& figures) {
    return fmt::format("  {:<11} {:.2f} eligible minutes; hit rate {}; {:.2f} false per minute; onset latency median "
                       "{:.1f} ms, p90 {:.1f} ms\n",
                       part, figures.eligible_minutes, told(figures.hit_rate()), figures.false_per_minute,
                       figures.latency_median_ms, figures.latency_p90_ms);
}

std::string grid_summary(const TuneCandidates& candidates) {
    auto text = fmt::format("grid        {} settings", candidates.settings.size());
    if (candidates.left_out > 0) {
        text += fmt::format(" ({} combinations left out: edges or levels the wrong way round)", candidates.left_out);
    }
    for (const auto& axis : candidates.axes) {
        text += fmt::format("; {} {}", axis.key, fmt::join(axis.values, ","));
    }
    return text + "\n";
}

void check_options(const TuneOptions& options) {
    if (options.part.empty() && !options.overwrite && std::filesystem::exists(options.out)) {
        throw Refusal("--out " + options.out.string(), "a file that exists", "a new name, or --overwrite");
    }
    if (!options.labels.empty() && options.labels.size() != options.recordings.size()) {
        throw Refusal("--labels", fmt::format("{} tables", options.labels.size()),
                      fmt::format("one for each recording, {}, or none", options.recordings.size()));
    }
}

WorkFile open_work(const TuneOptions& options, const WorkIdentity& identity, SweepPart part) {
    const auto file = options.part.empty() ? work_path(options.out) : work_path(options.out, part);
    const bool there = std::filesystem::exists(file);
    if (there && !options.resume && !options.overwrite) {
        throw Refusal(file.string(), "work of a sweep that was begun before",
                      "--resume to go on with it, or --overwrite to begin anew");
    }
    return there && options.resume ? WorkFile::resume(file, identity, part) : WorkFile::begin(file, identity, part);
}

[[noreturn]] void end_stopped(const SweepResults& results, std::size_t of, const char* what) {
    const auto done = std::count_if(results.begin(), results.end(), [](const auto& each) { return each.has_value(); });
    fmt::print(stderr, "stopped: {} of {} settings {}; the same command with --resume goes on from there\n", done, of,
               what);
    throw CLI::RuntimeError(stopped_status);
}

bool all_known(std::span<const std::optional<SweepResult>> results) {
    return std::all_of(results.begin(), results.end(), [](const auto& each) { return each.has_value(); });
}

// A file that holds nothing yet would only stand in the way of the next try.
void remove_empty_work(const TuneOptions& options, SweepPart part, const WorkFile& work) {
    const auto empty = [](const SweepResults& results) {
        return std::none_of(results.begin(), results.end(), [](const auto& each) { return each.has_value(); });
    };
    if (empty(work.swept())) {
        std::filesystem::remove(options.part.empty() ? work_path(options.out) : work_path(options.out, part));
    }
}

SweepResults sweep_part(const TunePlan& plan, WorkFile& work, SweepPart part) {
    const auto first = part.first(plan.identity.candidates), last = part.last(plan.identity.candidates);
    const auto from = static_cast<std::ptrdiff_t>(first), to = static_cast<std::ptrdiff_t>(last);
    const SweepResults known(work.swept().begin() + from, work.swept().begin() + to);
    Progress progress("sweep", 1.0);
    const StopSignals signals;
    SweepWatch watch;
    watch.progress = [&](double share) { progress.at(share); };
    watch.stop = [] { return StopSignals::wished(); };
    watch.finished = [&](std::size_t place, const SweepResult& result) {
        work.keep(SweepStage::swept, first + place, result);
    };
    auto results = sweep(plan.recordings, std::span(plan.candidates.settings).subspan(first, last - first), plan.sweep,
                         watch, known);
    if (!all_known(results)) {
        end_stopped(results, results.size(), "are swept");
    }
    return results;
}

SweepResults sweep_or_clean(const TuneOptions& options, const TunePlan& plan, WorkFile& work, SweepPart part) {
    try {
        return sweep_part(plan, work, part);
    } catch (const Refusal&) {
        remove_empty_work(options, part, work);
        throw;
    }
}

// The whole engine over the finalists, and over the next ones of the ranking as long as none can be picked.
TuneOutcome confirm_some(const TunePlan& plan, const SweepResults& swept, WorkFile* work, double limit) {
    auto confirmed = work != nullptr ? work->confirmed() : SweepResults(swept.size());
    auto outcome = outcome_of(swept, confirmed, limit);
    Progress progress("whole engine", 1.0);
    const StopSignals signals;
    SweepWatch watch;
    watch.progress = [&](double share) { progress.at(share); };
    watch.stop = [] { return StopSignals::wished(); };
    watch.finished = [&](std::size_t place, const SweepResult& result) {
        if (work != nullptr) {
            work->keep(SweepStage::confirmed, place, result);
        }
    };
    for (auto next = next_to_confirm(outcome, limit); !next.empty(); next = next_to_confirm(outcome, limit)) {
        confirmed = confirm(plan.recordings, plan.candidates.settings, next, plan.sweep, watch, confirmed);
        if (StopSignals::wished()) {
            end_stopped(confirmed, next.size(), "are run by the whole engine");
        }
        outcome = outcome_of(swept, confirmed, limit);
    }
    return outcome;
}

void write_tables(const TuneOptions& options, const TunePlan& plan, const TuneOutcome& outcome) {
    if (!options.table.empty()) {
        write_whole_file(options.table, sweep_table(plan.candidates, outcome));
    }
    if (!options.curve.empty()) {
        write_whole_file(options.curve, curve_table(plan.candidates, outcome));
    }
}

void tell_pick(const TuneOptions& options, const TunePlan& plan, const TuneOutcome& outcome) {
    const auto& best = *outcome.confirmed_of(*outcome.picked);
    fmt::print("{}truth       {}, early {} ms; the pick by the whole engine, with pulses:\n{}{}{}settings    {}\n",
               pick_sentence(plan.candidates, outcome, options.max_false_per_minute),
               options.labels.empty() ? "referee" : "labels", plan.sweep.early_ms,
               part_summary("training", best.training), part_summary("held out", best.held_out),
               doubts(best, options.max_false_per_minute), options.out.string());
    if (options.base.empty()) {
        fmt::print("note        without --settings the stream is written as float32 frames on standard input\n");
    }
}

void finish(const TuneOptions& options, const TunePlan& plan, const SweepResults& swept, WorkFile* work) {
    const auto outcome = confirm_some(plan, swept, work, options.max_false_per_minute);
    fmt::print("{}{}{}", grid_summary(plan.candidates),
               front_summary(plan.candidates, outcome, options.max_false_per_minute, options.show),
               curve_picture(outcome, options.max_false_per_minute));
    write_tables(options, plan, outcome);
    if (!outcome.picked) {
        throw Refusal("sweep",
                      fmt::format("no settings at {} false per minute or fewer on training and held-out parts",
                                  options.max_false_per_minute),
                      fmt::format("a wider grid, longer recordings or a larger --max-false-per-minute{}",
                                  work != nullptr ? " (with --resume nothing is swept twice)" : ""));
    }
    write_settings(tuned(plan.base, plan.candidates.settings[*outcome.picked], plan, options.base.empty()),
                   options.out);
    tell_pick(options, plan, outcome);
}

void finish_learning(const TuneOptions& options, const TunePlan& plan) {
    const auto learned = learn_from(options, plan);
    write_settings(tuned(plan.base, learned.detector, plan, options.base.empty()), options.out);
    fmt::print(
        "{}asked       {} false per minute\ntruth       {}, early {} ms; by the whole engine, with pulses:\n{}{}{}"
        "settings    {}\n",
        learned.text, options.max_false_per_minute, options.labels.empty() ? "referee" : "labels", plan.sweep.early_ms,
        part_summary("training", learned.figures.training), part_summary("held out", learned.figures.held_out),
        doubts(learned.figures, options.max_false_per_minute), options.out.string());
}

void run_part(const TuneOptions& options, const TunePlan& plan) {
    const auto part = part_of(options.part);
    auto work = open_work(options, plan.identity, part);
    static_cast<void>(sweep_or_clean(options, plan, work, part));
    fmt::print(
        "part {} of {}: {} of {} settings in {}\nonce all parts are there: the same command with --merge instead "
        "of --part\n",
        part.number, part.of, part.last(plan.identity.candidates) - part.first(plan.identity.candidates),
        plan.identity.candidates, work_path(options.out, part).string());
}

void run_command(const TuneOptions& options) {
    check_options(options);
    if (!options.part.empty()) {
        static_cast<void>(part_of(options.part)); // refused before anything is read
    }
    const auto plan = make_tune_plan(options);
    if (options.learn) {
        finish_learning(options, plan);
    } else if (!options.part.empty()) {
        run_part(options, plan);
    } else if (options.merge) {
        finish(options, plan, merge_parts(options.out, plan.identity), nullptr);
    } else {
        auto work = open_work(options, plan.identity, {});
        finish(options, plan, sweep_or_clean(options, plan, work, {}), &work);
        std::filesystem::remove(work_path(options.out));
    }
}

void add_grid(CLI::App& command, TuneOptions& options) {
    const auto list = [&](const char* name, const char* key, const char* what) {
        command.add_option(name, options.lists.at(key), what)
            ->delimiter(',')
            ->allow_extra_args(false)
            ->capture_default_str()
            ->each([&options, key = std::string(key)](const std::string&) {
                if (options.given_lists.empty() || options.given_lists.back() != key) {
                    options.given_lists.push_back(key);
                }
            });
    };
    list("--threshold-deviations", "threshold.deviations", "thresholds to try, separated by commas");
    list("--low-hz", "filter.low_hz", "lower edges of the band to try");
    list("--high-hz", "filter.high_hz", "upper edges of the band to try");
    list("--order", "filter.order", "orders of the filter to try");
    list("--smoothing-ms", "envelope.smoothing_ms", "smoothings of the envelope to try");
    command.add_option("--grid", options.grid,
                       "YAML file with the values to try: any key below `detector`, as in a settings file, each\n"
                       "with a list. Then the five options above hold only where they are given");
}

void add_long_work(CLI::App& command, TuneOptions& options) {
    command.add_option("--threads", options.threads, "settings tried at the same time; results do not depend on it")
        ->check(CLI::Range(1U, 256U))
        ->capture_default_str();
    command.add_flag("--resume", options.resume,
                     "go on where a sweep was stopped (Ctrl-C): its work is kept in OUT.work until it is done");
    auto* part = command.add_option("--part", options.part,
                                    "K/N: sweep the K-th of N parts of the grid and leave OUT.part-K-of-N, for a job\n"
                                    "array: --part $SLURM_ARRAY_TASK_ID/$SLURM_ARRAY_TASK_COUNT with --array=1-N");
    command.add_flag("--merge", options.merge, "put all parts beside OUT together; the outcome is that of one sweep")
        ->excludes(part);
}

} // namespace

void add_tune_command(CLI::App& program) {
    auto options = std::make_shared<TuneOptions>();
    auto& command = *program.add_subcommand(
        "tune",
        "try thresholds, bands, orders and smoothings on recordings and write the settings that find most ripples\n"
        "at N false per minute or fewer\n"
        "Each recording is cut into blocks: the 1st, 3rd, 5th ... are training parts,\n"
        "the 2nd, 4th, 6th ... are held out. All settings are swept as detectors without pulses, which shares the\n"
        "filters; the best, and those on the front of hit rate, false per minute and latency, are run again by the\n"
        "whole engine, armed, as dryrun does. Of these, those at N or fewer on the training parts are ranked by hit\n"
        "rate there (then by median onset latency, then false per minute); the first of them that is at N or fewer\n"
        "on the held-out parts too is picked. Floors start unsettled; the time that they need to settle is not\n"
        "scored. Recordings are held in memory, 4 bytes a sample: 72 MB for an hour of 4 sites at 1250 Hz");
    command.add_option("RECORDING", options->recordings, "one or more recordings of the same rate")->required();
    command.add_option("--out", options->out, "settings file to write")->required();
    command.add_option("--settings", options->base, "settings to start from; without it the defaults");
    auto* labels =
        command.add_option("--labels", options->labels,
                           "events tables with the ripples, one for each recording in their order, separated\n"
                           "by commas; without them the referee");
    labels->delimiter(',')->allow_extra_args(false);
    add_label_options(command, options->label_reading, labels);
    command.add_option("--referee", options->referee, referee_help())->excludes(labels);
    command.add_option("--max-false-per-minute", options->max_false_per_minute, "N of the rule above")
        ->check(CLI::Range(0.0, 1000.0))
        ->capture_default_str();
    auto* learn = command.add_flag("--learn", options->learn,
                                   "instead of a sweep: learn the evidence detector, that is a mix of the sites, the "
                                   "weights of its bands and the\n"
                                   "threshold for N false per minute, on the training parts");
    command
        .add_flag("--plain-mean", options->plain_mean,
                  "learn for the plain mean of the sites, so that the settings serve any number of them")
        ->needs(learn);
    add_grid(command, *options);
    command.add_option("--block-s", options->block_s, "length of the blocks that recordings are cut into")
        ->check(CLI::Range(1.0, 3600.0))
        ->capture_default_str();
    add_long_work(command, *options);
    command.add_option("--show", options->show, "lines of the table to print, best first")->capture_default_str();
    command.add_option("--table", options->table, "file for the table of all settings, tab-separated");
    command.add_option("--curve", options->curve,
                       "file for the trade-off, tab-separated: the settings that no other one beats");
    command.add_flag("--overwrite", options->overwrite, "replace --out, and work of an earlier sweep, where it exists");
    add_example(command, "build/millpond tune replay_files/four_sites_90s.flac --labels "
                         "replay_files/four_sites_90s.flac.truth.tsv --settings config/live.yaml --block-s 15 "
                         "--out tuned.yaml");
    command.callback([options] { run_command(*options); });
}

} // namespace millpond
