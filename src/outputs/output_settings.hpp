// What a user may say about where pulses go. Thread: control.
#pragma once

#include "base/describe.hpp"
#include "base/units.hpp"

#include <algorithm>
#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

namespace millpond {

enum class OutputKind : std::uint8_t {
    silent,        ///< orders are journaled and go nowhere
    osc,           ///< OSC 1.0 over UDP: one message when the line goes high, one when it goes low
    serial_lines,  ///< a modem line of a serial port, RTS or DTR
    serial_bytes,  ///< a microcontroller on a serial port, one byte an order
    parallel_port, ///< data bits of a parallel port, through ppdev
    daq_line,      ///< a digital line of a data acquisition board, through comedilib
    gpio_line      ///< a line of a GPIO chip, through libgpiod
};
inline constexpr Choice<OutputKind> output_kinds[] = {
    {OutputKind::silent, "silent"},
    {OutputKind::osc, "osc"},
    {OutputKind::serial_lines, "serial_lines"},
    {OutputKind::serial_bytes, "serial_bytes"},
    {OutputKind::parallel_port, "parallel_port"},
    {OutputKind::daq_line, "daq_line"},
    {OutputKind::gpio_line, "gpio_line"},
};

enum class Follows : std::uint8_t {
    pulse,  ///< rises with every pulse
    trigger ///< rises at every trigger in every condition, also where no pulse is given
};
inline constexpr Choice<Follows> follows_words[] = {{Follows::pulse, "pulse"}, {Follows::trigger, "trigger"}};

enum class ModemLine : std::uint8_t {
    rts,
    dtr
};
inline constexpr Choice<ModemLine> modem_lines[] = {{ModemLine::rts, "rts"}, {ModemLine::dtr, "dtr"}};

inline constexpr std::size_t most_outputs = 8;

/// One output, as settings give it. OSC arguments are typed by their look: 1 is an int32, 1.0 a float32, all else a
/// string.
struct OutputSettings {
    std::string name = "line";
    OutputKind kind = OutputKind::silent;
    Follows follows = Follows::pulse;
    double width_ms = 1.0;
    double longest_high_ms = 0.0;
    std::uint32_t train_pulses = 1;
    double train_period_ms = 10.0;
    std::string host = "127.0.0.1";
    std::uint16_t port = 9000;
    bool allow_other_hosts = false;
    std::string address = "/line";
    std::string high_arguments = "1";
    std::string low_arguments = "0";
    std::string device;
    bool inverted = false;
    ModemLine modem_line = ModemLine::rts;
    std::uint32_t baud = 115200;
    std::uint16_t data_bits = 1;
    std::uint32_t subdevice = 0;
    std::uint32_t channel = 0;
    std::string condition;

    bool operator==(const OutputSettings&) const = default;

    [[nodiscard]] bool is_device() const noexcept { return kind != OutputKind::silent && kind != OutputKind::osc; }
    /// The place of a key of this output, for a refusal: `outputs.NAME.key`.
    [[nodiscard]] std::string where(std::string_view key) const { return "outputs." + name + "." + std::string(key); }
    /// From the first rise to the last fall.
    [[nodiscard]] double train_ms() const noexcept { return (train_pulses - 1) * train_period_ms + width_ms; }
    /// The watchdog lowers a line that is high for longer than this.
    [[nodiscard]] double longest_high() const noexcept {
        return longest_high_ms > 0.0 ? longest_high_ms : std::max(5.0 * width_ms, 20.0);
    }
};

template <class Visitor> void describe(Visitor& visit, OutputSettings& output) {
    visit.text("name", output.name, "what reports call it: 1 to 31 characters, each name once");
    visit.choice("kind", output.kind, output_kinds, "kind of output");
    visit.choice("follows", output.follows, follows_words,
                 "pulse: rises with every pulse; trigger: marks every trigger in every condition, also where no pulse "
                 "is given");
    visit.text("condition", output.condition,
               "follows pulse: only pulses of this condition raise the line, so that each may have one of its own; "
               "nothing: those of all. Not in blinded sessions");
    visit.number("width_ms", output.width_ms, {0.05, 1000.0}, "how long the line is high in one pulse");
    visit.number("longest_high_ms", output.longest_high_ms, {0.0, 10000.0},
                 "a line that is high for longer is lowered by the watchdog, and the session faults; longer than "
                 "width_ms; 0: five times width_ms, at least 20");
    visit.whole("train_pulses", output.train_pulses, {1, 1000}, "pulses ordered for one trigger");
    visit.number("train_period_ms", output.train_period_ms, {0.1, 10000.0},
                 "from the start of one pulse of a train to the start of the next; longer than width_ms");
    visit.text("host", output.host, "osc: IPv4 address that orders go to");
    visit.whole("port", output.port, {1, 65535}, "osc: UDP port that orders go to");
    visit.flag("allow_other_hosts", output.allow_other_hosts,
               "osc: whether `host` may be another computer than this one");
    visit.text("address", output.address, "osc: address of the orders");
    visit.text("high_arguments", output.high_arguments,
               "osc: arguments that order the line high, separated by spaces: 1 is an int32, 1.0 a float32, a word a "
               "string");
    visit.text("low_arguments", output.low_arguments, "osc: arguments that order the line low, likewise");
    visit.text("device", output.device,
               "all kinds but silent and osc: path of the device, such as /dev/ttyS0, /dev/parport0, /dev/comedi0 or "
               "/dev/gpiochip0");
    visit.flag("inverted", output.inverted,
               "serial_lines, parallel_port, daq_line, gpio_line: whether the line's high is the device's low");
    visit.choice("modem_line", output.modem_line, modem_lines, "serial_lines: which line of the port");
    visit.whole("baud", output.baud, {1200, 4000000}, "serial_bytes: bits a second");
    visit.whole("data_bits", output.data_bits, {1, 255},
                "parallel_port: sum of the data bits that rise together: 1 is D0 (pin 2), 2 is D1, 128 is D7");
    visit.whole("subdevice", output.subdevice, {0, 255}, "daq_line: number of the board's digital subdevice");
    visit.whole("channel", output.channel, {0, 1023}, "daq_line, gpio_line: number of the line");
}

} // namespace millpond
