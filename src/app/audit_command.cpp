// `millpond audit SESSION`: what happened in a session, and whether the engine decides the same again.
#include "app/commands.hpp"
#include "app/progress.hpp"
#include "app/session_conditions.hpp"
#include "app/truth.hpp"
#include "audit/audit.hpp"
#include "audit/audit_text.hpp"
#include "base/refusal.hpp"
#include "journal/session_reader.hpp"
#include "settings/settings.hpp"
#include "sham/schedule.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <cstdio>
#include <memory>
#include <optional>

namespace millpond {
namespace {

struct AuditOptions {
    std::string session, labels, referee, out;
    LabelReading label_reading;
    bool json = false, overwrite = false;
};

// One line for each stage that takes long.
class Stages {
  public:
    void show(const char* doing, double share) {
        if (doing != doing_) {
            doing_ = doing;
            line_.emplace(doing, 1.0);
        }
        line_->at(share);
    }

  private:
    std::string doing_;
    std::optional<Progress> line_;
};

// A session may have been ended, or cut, before the recording that the labels are of.
Ripples labels_for(const AuditOptions& options, const SessionReader& session) {
    const auto& table = options.labels;
    auto ripples = ripples_from_table(table, session.rate(), UINT64_MAX, options.label_reading);
    const auto beyond = std::erase_if(ripples, [&](const Ripple& ripple) { return ripple.onset >= session.end(); });
    if (beyond > 0) {
        fmt::print(stderr, "audit: {} of {} ripples of {} lie beyond the session's end at {:.3f} s and are left out\n",
                   beyond, beyond + ripples.size(), table, seconds_at(session.end(), session.rate()));
    }
    return ripples;
}

// The places that the session did not come to stand in the schedule's file alone. It may be gone by now.
void take_schedule(AuditInput& input, const SessionReader& session) {
    const auto& file = input.settings.arbiter.schedule_file;
    if (file.empty()) {
        return;
    }
    try {
        input.schedule = read_schedule(file, session.rate());
    } catch (const Refusal& refusal) {
        input.about_schedule =
            std::string("its file cannot be read, so places not reached are not known: ") + refusal.what();
    }
}

AuditResult audit_with(const AuditOptions& options) {
    const SessionReader session(options.session); // refuses what is no session before anything else
    const auto settings = load_settings(session.settings_file());
    AuditInput input;
    input.session = options.session;
    input.settings = {settings.detector, settings.arbiter};
    input.settings_name = session.settings_file().string();
    input.assignment = known_assignment(session);
    take_schedule(input, session);
    if (!options.labels.empty()) {
        input.labels = labels_for(options, session);
        input.labels_name = options.labels;
    }
    input.referee = referee_settings_of(options.referee);
    Stages stages;
    input.progress = [&stages](const char* doing, double share) { stages.show(doing, share); };
    return audit_session(input);
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
        program.add_subcommand("audit", "what happened in a session, and whether it decides the same again");
    const auto options = std::make_shared<AuditOptions>();
    command->add_option("SESSION", options->session, "session folder of `millpond live`, closed or cut")->required();
    auto* labels =
        command->add_option("--labels", options->labels,
                            "events table with the ripples, the truth; those beyond the session's end are left out;\n"
                            "else the referee over the stored samples");
    add_label_options(*command, options->label_reading, labels);
    command->add_option("--referee", options->referee, referee_help())->excludes(labels);
    command->add_option("--out", options->out, "folder for audit.json and tables; made where it does not exist");
    command->add_flag("--overwrite", options->overwrite, "replace the files of an earlier audit in --out");
    command->add_flag("--json", options->json, "print JSON with the same figures instead of text");
    add_example(*command,
                "build/millpond audit \"$(ls -d sessions/*_rig | tail -n 1)\" --out audit_of_rig\n"
                "Exit status: 0 decisions reproduced and records intact, 1 differences or damage, 2 bad input.");
    command->callback([options] { run_audit(*options); });
}

} // namespace millpond
