#include "app/commands.hpp"
#include "app/dry_run.hpp"
#include "app/dry_run_tables.hpp"
#include "base/refusal.hpp"
#include "recording/whole_file.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <memory>

namespace millpond {
namespace {

struct Options {
    DryRunPlan plan;
    std::filesystem::path out;
    bool not_armed = false;
    bool overwrite = false;
};

void write_results(const DryRun& run, const std::filesystem::path& folder) {
    write_dry_run_events(run, folder / "events.tsv");
    write_whole_file(folder / "score.json", dry_run_json(run));
    if (run.agreement) {
        write_whole_file(folder / "agreement.tsv", agreement_table(*run.agreement));
    }
}

// The folder appears whole: it is made under another name and renamed.
void write_folder(const DryRun& run, const Options& options) {
    if (std::filesystem::is_directory(options.out)) {
        write_results(run, options.out);
        return;
    }
    auto unfinished = options.out;
    unfinished += ".unfinished";
    std::error_code trouble;
    std::filesystem::remove_all(unfinished, trouble);
    if (!std::filesystem::create_directories(unfinished, trouble)) {
        throw Refusal(options.out.string(), "no folder could be made: " + trouble.message(), "a place to write to");
    }
    write_results(run, unfinished);
    std::filesystem::rename(unfinished, options.out);
}

void run_command(Options& options) {
    while (options.out.has_relative_path() && !options.out.has_filename()) {
        options.out = options.out.parent_path(); // a slash at its end
    }
    if (std::filesystem::exists(options.out) && !(options.overwrite && std::filesystem::is_directory(options.out))) {
        throw Refusal("--out " + options.out.string(), "something of that name",
                      "a new folder, or --overwrite for one that exists");
    }
    if (!options.plan.referee.empty() && !options.plan.labels.empty() && !options.plan.agreement) {
        throw Refusal("--referee", "--labels beside it, which are the truth then",
                      "one of the two, or --agreement, which compares them");
    }
    options.plan.armed = !options.not_armed;
    const auto run = dry_run(options.plan);
    write_folder(run, options);
    fmt::print("{}  results         {}: events.tsv, score.json{}\n", dry_run_summary(run), options.out.string(),
               run.agreement ? ", agreement.tsv" : "");
    if (run.agreement) {
        fmt::print("{}", agreement_text(*run.agreement, run.rate));
    }
}

} // namespace

void add_dryrun_command(CLI::App& program) {
    auto options = std::make_shared<Options>();
    auto& command = *program.add_subcommand(
        "dryrun",
        "run the engine over a recording, as fast as it goes, and score it against labels or the referee\n"
        "The arbiter runs as if armed from the first sample, whatever the settings say, so that triggers,\n"
        "lock-out and limits show; no pulse leaves the computer. The recording's rate is used, and the settings'\n"
        "channels where they list some, else the recording's");
    command.add_option("RECORDING", options->plan.recording, "WAV, RF64, W64, FLAC, raw or EDF+ file")->required();
    command.add_option("--settings", options->plan.settings, "settings file, the same as for a session")->required();
    command
        .add_option("--out", options->out,
                    "folder for events.tsv, score.json and, with --agreement, agreement.tsv; must not exist")
        ->required();
    auto* labels = command.add_option("--labels", options->plan.labels,
                                      "events table with the ripples, the truth; else the referee");
    add_label_options(command, options->plan.label_reading, labels);
    command.add_option("--referee", options->plan.referee, referee_help());
    command.add_flag("--agreement", options->plan.agreement,
                     "compare all rules of the referee, and the labels with each: how many events they share");
    command.add_option("--sidecar", options->plan.sidecar,
                       "what the recording's file does not say; else RECORDING.yaml");
    command.add_flag("--not-armed", options->not_armed,
                     "run as a session before it is armed: every detection is withheld, and a veto does not show");
    command
        .add_option("--packet-frames", options->plan.packet_frames,
                    "frames given to the engine at a time; decisions do not depend on it")
        ->check(CLI::Range(std::size_t{1}, std::size_t{1000000}))
        ->capture_default_str();
    command.add_flag("--overwrite", options->overwrite, "write into --out where it exists");
    add_example(command, "build/millpond dryrun replay_files/four_sites_90s.flac --settings config/live.yaml "
                         "--labels replay_files/four_sites_90s.flac.truth.tsv --out dry\n"
                         "  build/millpond dryrun replay_files/four_sites_90s.flac --settings config/live.yaml "
                         "--referee deceuninck_2024 --agreement --out dry_by_rules");
    command.callback([options] { run_command(*options); });
}

} // namespace millpond
