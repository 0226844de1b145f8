// What somebody outside may tell a running session, as one fixed-size value on its way into the loop.
#pragma once

#include "base/event.hpp"
#include "base/units.hpp"

#include <array>
#include <cstdint>
#include <string_view>

namespace millpond {

enum class CommandKind : std::uint8_t {
    arm,        ///< pulses are allowed
    disarm,     ///< pulses are not allowed
    mark,       ///< a text note into the journal
    open_gate,  ///< by name
    close_gate, ///< by name
    stop,       ///< emergency stop: takes the short way, never the ring
    clear,      ///< a fault or an emergency stop is over: not armed
    next_epoch, ///< the plan's next epoch begins
    speed,      ///< the animal's speed
    trial       ///< the next trial of the assignment begins
};

struct Command {
    CommandKind kind{};
    std::uint8_t length = 0;
    std::array<char, 254> text{}; ///< gate name or note
    double number = 0.0;          ///< speed
    Nanos came{};                 ///< when it was read, by the monotonic clock
    ChangedBy by;                 ///< whoever sent it

    /// Longer texts are cut. Thread: control.
    static Command make(CommandKind kind, std::string_view text = {}) noexcept {
        Command command;
        command.kind = kind;
        command.length =
            static_cast<std::uint8_t>(text.size() < command.text.size() ? text.size() : command.text.size());
        text.copy(command.text.data(), command.length);
        return command;
    }
    [[nodiscard]] std::string_view words() const noexcept { return {text.data(), length}; }
};

} // namespace millpond
