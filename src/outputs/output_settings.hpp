// What a user may say about where pulses go. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <string>

namespace millpond {

enum class OutputKind : std::uint8_t {
    silent, ///< orders are journaled and go nowhere
    osc     ///< OSC 1.0 over UDP: one message when the line goes high, one when it goes low
};
inline constexpr Choice<OutputKind> output_kinds[] = {{OutputKind::silent, "silent"}, {OutputKind::osc, "osc"}};

/// One order, as settings give it; arguments are typed by their look: 1 is an int32, 1.0 a float32, all else a string.
struct OutputSettings {
    OutputKind kind = OutputKind::silent;
    std::string host = "127.0.0.1";
    std::uint16_t port = 9000;
    bool allow_other_hosts = false;
    std::string address = "/line";
    std::string high_arguments = "1";
    std::string low_arguments = "0";
    double width_ms = 1.0;
    std::uint32_t train_pulses = 1;
    double train_period_ms = 10.0;

    bool operator==(const OutputSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, OutputSettings& output) {
    visit.choice("kind", output.kind, output_kinds, "kind of output");
    visit.text("host", output.host, "IPv4 address that OSC orders go to");
    visit.whole("port", output.port, {1, 65535}, "UDP port that OSC orders go to");
    visit.flag("allow_other_hosts", output.allow_other_hosts, "whether `host` may be another computer than this one");
    visit.text("address", output.address, "OSC address of the orders");
    visit.text(
        "high_arguments", output.high_arguments,
        "OSC arguments that order the line high, separated by spaces: 1 is an int32, 1.0 a float32, a word a string");
    visit.text("low_arguments", output.low_arguments, "OSC arguments that order the line low, likewise");
    visit.number("width_ms", output.width_ms, {0.05, 1000.0}, "how long the line is high in one pulse");
    visit.whole("train_pulses", output.train_pulses, {1, 1000}, "pulses ordered for one trigger");
    visit.number("train_period_ms", output.train_period_ms, {0.1, 10000.0},
                 "from the start of one pulse of a train to the start of the next; longer than width_ms");
}

} // namespace millpond
