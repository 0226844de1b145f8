// millpond preflight: is this computer fit for a session with these settings? Nothing is armed and no pulse is ordered.
#include "app/commands.hpp"
#include "app/from_settings.hpp"
#include "app/limits_findings.hpp"
#include "app/wiring.hpp"
#include "base/refusal.hpp"
#include "journal/record_file.hpp"
#include "outputs/make_output.hpp"
#include "realtime/fitness.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <algorithm>
#include <memory>

namespace millpond {
namespace {

constexpr double wake_seconds = 1.5;
// Measured: records.mpj of played sessions held 365 to 406 a second, nearly all of them latencies; rounded up.
constexpr double records_per_second = 450.0;

Finding refused(const std::string& about, const Refusal& refusal) {
    return {Fitness::bad, about, refusal.what()};
}

/// Runs `work`, which says what is good; a refusal becomes a finding.
template <class Work> Finding tried(const std::string& about, Work work) {
    try {
        return {Fitness::good, about, work()};
    } catch (const Refusal& refusal) {
        return refused(about, refusal);
    }
}

std::string try_engine(const Settings& settings, const StreamSettings& stream, const std::string& file) {
    const auto channels = channels_for(settings, ripple_channels(stream.channels), file);
    const Hertz rate{stream.rate_hz};
    const auto detector = make_detector(settings, channels, rate);
    (void)schedule_for(settings.arbiter, rate);
    auto assigned_settings = settings;
    (void)assigned_for(assigned_settings, rate, file);
    for (const auto& output : settings.outputs) {
        (void)pulse_shape(output);
    }
    return fmt::format("{} channels at {} Hz; band-pass delays {:.1f} ms at its centre, with smoothing {:.1f} ms",
                       channels.size(), stream.rate_hz, detector.filter_delay_samples() / rate.value * 1e3,
                       detector.delay_samples() / rate.value * 1e3);
}

std::string try_stream(const StreamSettings& stream) {
    if (stream.source == SourceKind::pipe) {
        return "samples will come on standard input";
    }
    (void)open_source(stream);
    if (stream.source == SourceKind::daq) {
        return fmt::format("{} samples {} channels at {} Hz", stream.device, stream.channels, stream.rate_hz);
    }
    return fmt::format("{}:{} is free", stream.listen_address, stream.port);
}

std::string try_control(const Settings& settings) {
    if (!settings.control.listen) {
        return "not asked for (control.listen)";
    }
    boost::asio::io_context context;
    CommandRing commands(4);
    const CommandListener listener(context, settings.control, commands_for(settings, false), commands, {},
                                   [](const std::string&) {});
    return fmt::format("{}:{} is free", settings.control.listen_address, settings.control.port);
}

std::string words_for(const OutputSettings& output) {
    const auto kind = std::string(word_for<OutputKind>(output_kinds, output.kind));
    const auto on = kind + " on " + output.device;
    switch (output.kind) {
    case OutputKind::silent:
        return "silent: orders are journaled and go nowhere";
    case OutputKind::osc:
        return fmt::format("OSC to {}:{} {}; whether anybody listens there cannot be asked", output.host, output.port,
                           output.address);
    case OutputKind::serial_lines:
        return on + ", line " + std::string(word_for<ModemLine>(modem_lines, output.modem_line)) +
               ": took the order low. The kernel raises RTS and DTR for a moment when a port is opened: connect after "
               "the start";
    case OutputKind::serial_bytes:
        return on + ": answered, and took the order low";
    case OutputKind::parallel_port:
        return fmt::format("{}, data bits {}: took the order low", on, output.data_bits);
    default:
        return fmt::format("{}, channel {}: took the order low", on, output.channel);
    }
}

Finding check_output(const OutputSettings& settings, Output& output) {
    const auto about = "output " + settings.name;
    if (!output.set_line(false) || !output.answers()) {
        return {Fitness::bad, about, "does not take the order low, or does not answer"};
    }
    return {settings.kind == OutputKind::serial_lines ? Fitness::caution : Fitness::good, about, words_for(settings)};
}

Finding check_watchdog(const Settings& settings, const std::vector<std::unique_ptr<Output>>& outputs) {
    LineBoard board;
    const auto keeper = make_keeper(settings, outputs, board);
    std::string lines;
    for (const auto& output : settings.outputs) {
        lines += fmt::format("{}{} after {:g} ms high", lines.empty() ? "" : ", ", output.name, output.longest_high());
    }
    const auto found = fmt::format("a process of its own lowers {}, and all when the program dies; a power cut, a "
                                   "stopped kernel or a cable out of its socket is beyond it",
                                   lines);
    return {Fitness::good, "watchdog", found};
}

/// All outputs at once: some share a device.
std::vector<Finding> check_outputs(const Settings& settings) {
    std::vector<Finding> findings;
    try {
        const auto outputs = make_outputs(settings.outputs);
        for (std::size_t i = 0; i < outputs.size(); ++i) {
            findings.push_back(check_output(settings.outputs[i], *outputs[i]));
        }
        findings.push_back(check_watchdog(settings, outputs));
    } catch (const Refusal& refusal) {
        findings.push_back(refused("outputs", refusal));
    }
    return findings;
}

double bytes_per_second(const Settings& settings, const StreamSettings& stream) {
    const double samples =
        settings.session.store_samples == StoreSamples::none ? 0.0 : stream.rate_hz * stream.channels * 4.0;
    return samples + records_per_second * record_bytes;
}

std::vector<Finding> findings_for(const std::string& file) {
    const auto settings = load_settings(file);
    const auto stream = resolved(settings.stream, file);
    std::vector<Finding> findings{{Fitness::good, "settings", file + " is valid"}};
    const auto add = [&](std::vector<Finding> more) { findings.insert(findings.end(), more.begin(), more.end()); };
    findings.push_back(tried("engine", [&] { return try_engine(settings, stream, file); }));
    findings.push_back(
        tried(stream.source == SourceKind::daq ? "stream" : "stream port", [&] { return try_stream(stream); }));
    findings.push_back(tried("command port", [&] { return try_control(settings); }));
    add(check_outputs(settings));
    add(check_limits(settings));
    add(check_stimulus(settings.stimulus));
    add(check_rights(settings.realtime));
    findings.push_back(check_throttling(settings.realtime));
    findings.push_back(check_wake(settings.realtime, wake_seconds));
    add(check_clock());
    add(check_disk(settings.session.folder, bytes_per_second(settings, stream), settings.session.min_free_mb));
    return findings;
}

void run_preflight(const std::string& file) {
    const auto findings = findings_for(file);
    for (const auto& finding : findings) {
        const auto* word = finding.fitness == Fitness::good      ? "good"
                           : finding.fitness == Fitness::caution ? "caution"
                                                                 : "BAD";
        fmt::print("{:8}{:18}{}\n", word, finding.about, finding.found);
    }
    const auto bad = std::count_if(findings.begin(), findings.end(),
                                   [](const auto& finding) { return finding.fitness == Fitness::bad; });
    const auto cautions = std::count_if(findings.begin(), findings.end(),
                                        [](const auto& finding) { return finding.fitness == Fitness::caution; });
    fmt::print("{}: {} bad, {} cautions\n", bad == 0 ? "fit" : "NOT FIT", bad, cautions);
    if (bad > 0) {
        throw CLI::RuntimeError(1);
    }
}

} // namespace

void add_preflight_command(CLI::App& program) {
    auto* command = program.add_subcommand("preflight", "is this computer fit for a session with these settings?");
    auto file = std::make_shared<std::string>();
    command->add_option("SETTINGS", *file, "settings file")->required();
    add_example(*command, "build/millpond preflight config/live.yaml");
    command->footer(command->get_footer() + "\nExit status: 0 fit (read the cautions), 1 not fit, 2 settings refused.");
    command->callback([file] { run_preflight(*file); });
}

} // namespace millpond
