// `millpond audit SESSION`: what happened in a session, and whether the engine decides the same again.
#include "app/commands.hpp"
#include "audit/audit.hpp"
#include "audit/audit_text.hpp"
#include "base/clock.hpp"
#include "journal/session_reader.hpp"
#include "settings/settings.hpp"
#include "settings/yaml_reader.hpp"

#include <CLI/CLI.hpp>

#include <cstdio>
#include <memory>
#include <unistd.h>

namespace millpond {
namespace {

struct AuditOptions {
    std::string session, labels, referee, out;
    bool json = false, overwrite = false;
};

// On stderr, once the work has taken 2 s; a line that rewrites itself on a terminal, one every 5 s elsewhere.
class ProgressLine {
  public:
    void show(const char* doing, double share) {
        const auto now = monotonic_now();
        const auto pause = terminal_ ? std::chrono::milliseconds{200} : std::chrono::milliseconds{5000};
        if (now - began_ < std::chrono::seconds{2} || now - shown_ < pause) {
            return;
        }
        shown_ = now;
        std::fprintf(stderr, terminal_ ? "\r%s: %3.0f %%  " : "%s: %3.0f %%\n", doing, 100.0 * share);
        std::fflush(stderr);
    }
    void end() const {
        if (terminal_ && shown_ > Nanos{}) {
            std::fprintf(stderr, "\r                    \r");
        }
    }

  private:
    bool terminal_ = ::isatty(STDERR_FILENO) != 0;
    Nanos began_ = monotonic_now();
    Nanos shown_{};
};

AuditResult audit_with(const AuditOptions& options) {
    const SessionReader session(options.session); // refuses what is no session before anything else
    const auto settings = load_settings(session.settings_file());
    AuditInput input;
    input.session = options.session;
    input.settings = {settings.detector, settings.arbiter};
    input.settings_name = session.settings_file().string();
    input.labels = options.labels;
    if (!options.referee.empty()) {
        input.referee = read_yaml_file<RefereeSettings>(options.referee);
    }
    ProgressLine line;
    input.progress = [&line](const char* doing, double share) { line.show(doing, share); };
    auto result = audit_session(input);
    line.end();
    return result;
}

void run_audit(const AuditOptions& options) {
    const auto result = audit_with(options);
    if (!options.out.empty()) {
        write_audit(result, options.out, options.overwrite);
    }
    const auto text = options.json ? audit_json(result).dump(2) + "\n" : audit_text(result);
    std::fwrite(text.data(), 1, text.size(), stdout);
    if (!result.objections().empty()) {
        for (const auto& objection : result.objections()) {
            std::fprintf(stderr, "audit: %s\n", objection.c_str());
        }
        std::fflush(stdout);
        throw CLI::RuntimeError(1);
    }
}

} // namespace

void add_audit_command(CLI::App& program) {
    auto* command =
        program.add_subcommand("audit", "What happened in a session, and whether it decides the same again");
    const auto options = std::make_shared<AuditOptions>();
    command->add_option("session", options->session, "Session folder of `millpond live`, closed or cut")
        ->required()
        ->type_name("SESSION");
    command
        ->add_option("--labels", options->labels,
                     "Events table of the ripples to score against (trial_type ripple); without it the referee "
                     "looks for them in the stored samples")
        ->type_name("TABLE");
    command->add_option("--referee", options->referee, "YAML file with the referee's settings; without it its defaults")
        ->type_name("FILE");
    command->add_option("--out", options->out, "Folder for audit.json and tables (made where it does not exist)")
        ->type_name("DIR");
    command->add_flag("--overwrite", options->overwrite, "Replace the files of an earlier audit in --out");
    command->add_flag("--json", options->json, "Print JSON with the same figures instead of text");
    add_example(*command,
                "./build/millpond audit \"$(ls -d sessions/*_demo | tail -n 1)\" --out audit_of_demo\n"
                "Exit status: 0 decisions reproduced and records intact, 1 differences or damage, 2 bad input.");
    command->callback([options] { run_audit(*options); });
}

} // namespace millpond
