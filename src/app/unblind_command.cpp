// `millpond unblind`: tells the conditions of sealed sessions, once, and writes down who asked and why.
#include "app/commands.hpp"
#include "app/session_conditions.hpp"
#include "assignment/unblinding.hpp"
#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "journal/provenance.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <filesystem>
#include <memory>

namespace millpond {
namespace {

struct UnblindOptions {
    std::vector<std::filesystem::path> sessions;
    std::filesystem::path list;
    Unblinding asked;
};

void run_unblind(UnblindOptions& options) {
    const auto list = read_assignment(options.list);
    options.asked.time = utc_text(realtime_now().count());
    for (const auto& folder : options.sessions) {
        const auto kept = kept_assignment(SessionReader(folder));
        if (!kept) {
            throw Refusal(folder.string(), "a session without an assignment", "one whose condition a list assigned");
        }
        unblind(folder, *kept, list, options.asked);
        fmt::print("{}  {} ", folder.string(), kept->code);
        for (const auto condition : session_of(list, kept->code, folder.string()).conditions) {
            fmt::print(" {}", word_for<Condition>(conditions, condition));
        }
        fmt::print("\n");
    }
}

} // namespace

void add_unblind_command(CLI::App& program) {
    auto& command = *program.add_subcommand(
        "unblind", "tell the conditions of sealed sessions, once; who asked, when and why is kept with them");
    auto options = std::make_shared<UnblindOptions>();
    command.add_option("SESSION", options->sessions, "session folders")->required();
    command.add_option("--list", options->list, "the list that they were run with")->required();
    command.add_option("--by", options->asked.by, "who asks")->required();
    command.add_option("--why", options->asked.why, "why: the protocol's reason, as a rule that scoring is done")
        ->required();
    add_example(command, "build/millpond unblind sessions/* --list build/rats.assignment.yaml --by \"A. Brook\" "
                         "--why \"scoring is done\"");
    command.callback([options] { run_unblind(*options); });
}

} // namespace millpond
