#include "app/commands.hpp"
#include "app/dry_run_tables.hpp"
#include "app/from_settings.hpp"
#include "app/progress.hpp"
#include "app/truth.hpp"
#include "app/tune_grid.hpp"
#include "base/refusal.hpp"
#include "recording/recording_reader.hpp"
#include "recording/whole_file.hpp"
#include "referee/referee_report.hpp"
#include "settings/settings.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <memory>
#include <vector>

namespace millpond {
namespace {

using Paths = std::vector<std::filesystem::path>;

struct Options {
    Paths recordings, labels;
    LabelReading label_reading;
    std::filesystem::path base, out, table;
    std::string referee;
    TuneGrid grid;
    double max_false_per_minute = 1.0;
    SweepPlan plan;
    std::size_t show = 20;
    bool overwrite = false;
};

struct Loaded {
    std::vector<LoadedRecording> files; // hold the samples
    std::vector<TuningRecording> recordings;
};

Settings base_settings(const Options& options) {
    return options.base.empty() ? Settings{} : load_settings(options.base);
}

void add_truth(const Options& options, std::size_t index, TuningRecording& recording, Hertz rate) {
    if (!options.labels.empty()) {
        recording.truth = ripples_from_table(options.labels[index], rate, recording.frames(), options.label_reading);
        return;
    }
    const auto settings = referee_settings_of(options.referee);
    auto found =
        find_ripples(settings, recording.channels, rate, {SampleIndex{0}, recording.channels.size(), recording.data},
                     options.referee.empty() ? "referee" : options.referee);
    fmt::print(stderr, "referee: {}: {} ripples, rule {}; artefacts: {}\n",
               options.recordings[index].filename().string(), found.ripples.size(), rule_text(settings),
               artefacts_text(settings, found, recording.channels, rate));
    recording.truth = std::move(found.ripples);
    recording.excluded = std::move(found.artefacts.excluded);
}

Loaded load(const Options& options, const Settings& base) {
    Loaded loaded;
    Progress progress("reading", static_cast<double>(options.recordings.size()));
    for (const auto& path : options.recordings) {
        loaded.files.push_back(load_recording(path));
        const auto& file = loaded.files.back();
        const auto& first = loaded.files.front();
        if (file.info.rate != first.info.rate) {
            throw Refusal(path.string(), fmt::format("{} Hz", file.info.rate.value),
                          fmt::format("the rate of the first recording, {} Hz", first.info.rate.value));
        }
        TuningRecording recording{channels_for(base, file.info.channels, options.base.string()), file.data, {}, {}};
        add_truth(options, loaded.recordings.size(), recording, file.info.rate);
        loaded.recordings.push_back(std::move(recording));
        progress.at(static_cast<double>(loaded.files.size()));
    }
    return loaded;
}

Settings tuned(Settings settings, const DetectorSettings& picked, const Loaded& loaded, bool without_base) {
    settings.detector = picked;
    settings.detector.floor.warm_start_session.clear(); // floors of another filter would be wrong
    if (settings.channels.empty()) {
        settings.channels = loaded.recordings.front().channels;
    }
    if (without_base) {
        settings.stream.source = SourceKind::pipe;
        settings.stream.encoding = SampleEncoding::float32;
        settings.stream.rate_hz = loaded.files.front().info.rate.value;
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

std::string part_summary(const char* part, const Score& score) {
    return fmt::format("  {:<11} {:.2f} eligible minutes; hit rate {}; {:.2f} false per minute; onset latency median "
                       "{:.1f} ms, p90 {:.1f} ms\n",
                       part, score.eligible_minutes, told(score.hit_rate), score.false_per_minute,
                       score.onset_latency_ms.median, score.onset_latency_ms.p90);
}

void check_options(const Options& options) {
    if (!options.overwrite && std::filesystem::exists(options.out)) {
        throw Refusal("--out " + options.out.string(), "a file that exists", "a new name, or --overwrite");
    }
    if (!options.labels.empty() && options.labels.size() != options.recordings.size()) {
        throw Refusal("--labels", fmt::format("{} tables", options.labels.size()),
                      fmt::format("one for each recording, {}, or none", options.recordings.size()));
    }
}

void run_command(Options& options) {
    check_options(options);
    const auto base = base_settings(options);
    const auto loaded = load(options, base);
    const auto candidates = candidates_of(options.grid, base.detector);
    if (candidates.empty()) {
        throw Refusal("--low-hz, --high-hz", "no band with low_hz below high_hz", "one or more");
    }
    options.plan.rate = loaded.files.front().info.rate;
    options.plan.arbiter = base.arbiter;
    options.plan.arbiter.condition = Condition::disrupt;
    options.plan.early_ms = options.labels.empty() ? referee_early_ms : 0.0;
    std::vector<SweepResult> results;
    {
        Progress progress("sweep", static_cast<double>(candidates.size()));
        results = sweep(loaded.recordings, candidates, options.plan,
                        [&](std::size_t done) { progress.at(static_cast<double>(done)); });
    }
    const auto picked = pick(results, options.max_false_per_minute);
    fmt::print("{}", sweep_summary(candidates, results, options.max_false_per_minute, picked, options.show));
    if (!options.table.empty()) {
        write_whole_file(options.table, sweep_table(candidates, results, picked));
    }
    if (!picked) {
        throw Refusal("sweep",
                      fmt::format("no settings at {} false per minute or fewer on training and held-out parts",
                                  options.max_false_per_minute),
                      "a wider grid, longer recordings or a larger --max-false-per-minute");
    }
    write_settings(tuned(base, candidates[picked->index], loaded, options.base.empty()), options.out);
    const auto& best = results[picked->index];
    fmt::print("picked (*), {} ranked before it passed over; truth: {}, early {} ms\n{}{}settings    {}\n",
               picked->passed_over, options.labels.empty() ? "referee" : "labels", options.plan.early_ms,
               part_summary("training", best.training), part_summary("held out", best.held_out), options.out.string());
    if (options.base.empty()) {
        fmt::print("note        without --settings the stream is written as float32 frames on standard input\n");
    }
}

void add_grid(CLI::App& command, TuneGrid& grid) {
    const auto list = [&](const char* name, auto& values, const char* what) {
        command.add_option(name, values, what)->delimiter(',')->allow_extra_args(false)->capture_default_str();
    };
    list("--threshold-deviations", grid.threshold_deviations, "thresholds to try, separated by commas");
    list("--low-hz", grid.low_hz, "lower edges of the band to try");
    list("--high-hz", grid.high_hz, "upper edges of the band to try");
    list("--order", grid.order, "orders of the filter to try");
    list("--smoothing-ms", grid.smoothing_ms, "smoothings of the envelope to try");
}

} // namespace

void add_tune_command(CLI::App& program) {
    auto options = std::make_shared<Options>();
    auto& command = *program.add_subcommand(
        "tune",
        "try thresholds, bands, orders and smoothings on recordings and write the settings that find most ripples\n"
        "at N false per minute or fewer\n"
        "Each recording is cut into blocks: the 1st, 3rd, 5th ... are training parts,\n"
        "the 2nd, 4th, 6th ... are held out. Settings at N or fewer on the training parts are ranked by hit rate\n"
        "there (then by median onset latency, then false per minute); the first of them that is at N or fewer on the\n"
        "held-out parts too is picked. Engine and scoring are those of dryrun, armed and from an unsettled floor;\n"
        "the time that the floor needs to settle is not scored. Recordings are held in memory, 4 bytes a sample");
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
    add_grid(command, options->grid);
    command.add_option("--block-s", options->plan.block_s, "length of the blocks that recordings are cut into")
        ->check(CLI::Range(1.0, 3600.0))
        ->capture_default_str();
    command
        .add_option("--threads", options->plan.threads, "settings tried at the same time; results do not depend on it")
        ->check(CLI::Range(1U, 256U))
        ->capture_default_str();
    command.add_option("--show", options->show, "lines of the table to print, best first")->capture_default_str();
    command.add_option("--table", options->table, "file for the whole table, tab-separated");
    command.add_flag("--overwrite", options->overwrite, "replace --out where it exists");
    add_example(command, "build/millpond tune replay_files/four_sites_90s.flac --labels "
                         "replay_files/four_sites_90s.flac.truth.tsv --settings config/live.yaml --block-s 15 "
                         "--out tuned.yaml");
    command.callback([options] { run_command(*options); });
}

} // namespace millpond
