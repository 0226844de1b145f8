// The program: reads the command line, runs one command, turns a refusal into one line and exit status 2.
#include "app/commands.hpp"
#include "app/wiring.hpp"
#include "base/refusal.hpp"

#include <CLI/CLI.hpp>

#include <cstdio>
#include <exception>
#include <string>

namespace {

// CLI11 asks for a command before it looks at a first word that is none.
std::string told(const CLI::App& program, const CLI::ParseError& trouble, int argc, char** argv) {
    if (!program.get_subcommands().empty() || argc < 2 || argv[1][0] == '-') {
        return std::string(trouble.what()) + " (millpond --help lists what is allowed)";
    }
    std::string commands;
    for (const auto* command : program.get_subcommands({})) {
        commands += (commands.empty() ? "" : ", ") + command->get_name();
    }
    return "found '" + std::string(argv[1]) + "'; allowed: " + commands;
}

} // namespace

int main(int argc, char** argv) {
    CLI::App program{"millpond: finds hippocampal ripples in a running LFP stream and orders pulses to stop them.\n"
                     "A research tool, not a medical device: follow the approved protocol, local rules and the\n"
                     "licensed veterinarian's advice."};
    program.name("millpond");
    program.set_version_flag("--version", millpond::program_name());
    try {
        millpond::add_commands(program);
        program.parse(argc, argv);
    } catch (const CLI::RuntimeError& outcome) {
        return outcome.get_exit_code(); // a command ran and has said what it found
    } catch (const CLI::ParseError& trouble) {
        if (trouble.get_exit_code() == static_cast<int>(CLI::ExitCodes::Success)) {
            return program.exit(trouble); // help or version
        }
        std::fprintf(stderr, "millpond: command line: %s\n", told(program, trouble, argc, argv).c_str());
        return 2;
    } catch (const millpond::Refusal& refusal) {
        std::fprintf(stderr, "millpond: %s\n", refusal.what());
        return 2;
    } catch (const std::exception& trouble) {
        std::fprintf(stderr, "millpond: failed: %s\n", trouble.what());
        return 1;
    }
    return 0;
}
