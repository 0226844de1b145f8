// The program's commands: one file each in this room, one function each here. Thread: control.
#pragma once

#include <CLI/App.hpp>

namespace millpond {

/// Adds all commands of the program.
void add_commands(CLI::App& program);

// Each adds its own subcommand; what it does runs in the subcommand's callback, which may throw Refusal.
void add_live_command(CLI::App& program);
void add_dryrun_command(CLI::App& program);
void add_tune_command(CLI::App& program);
void add_sham_command(CLI::App& program);
void add_assign_command(CLI::App& program);
void add_unblind_command(CLI::App& program);
void add_audit_command(CLI::App& program);
void add_synth_command(CLI::App& program);
void add_feed_command(CLI::App& program);
void add_preflight_command(CLI::App& program);

/// Example shown at the end of a subcommand's help; works as typed from the project's folder after a build.
void add_example(CLI::App& command, const std::string& example);

} // namespace millpond
