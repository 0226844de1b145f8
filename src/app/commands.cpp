#include "app/commands.hpp"

namespace millpond {

void add_commands(CLI::App& program) {
    // In the order of an experiment: before, during, after; then the stand-ins.
    add_preflight_command(program);
    add_dryrun_command(program);
    add_tune_command(program);
    add_sham_command(program);
    add_assign_command(program);
    add_live_command(program);
    add_unblind_command(program);
    add_audit_command(program);
    add_synth_command(program);
    add_feed_command(program);
    program.require_subcommand(1);
}

void add_example(CLI::App& command, const std::string& example) {
    command.footer("Example:\n  " + example);
}

} // namespace millpond
