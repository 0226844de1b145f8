// Turns OSC messages into commands: /arm, /disarm, /stop, /clear, /mark TEXT, /gate NAME 1 or 0, /epoch, /speed NUMBER,
// /trial, each with the secret first where one is set; /stop alone is taken with and without it. Thread: control.
#pragma once

#include "control/command.hpp"

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace millpond {

/// Either a command, or one line that says why the packet was refused (for the operator's log).
struct OscVerdict {
    std::optional<Command> command;
    std::string refusal;
};

/// Commands that a session takes because its settings ask for what they move.
struct MoreCommands {
    bool trials = false; ///< there are trials that somebody marks
    bool epoch = false;  ///< there is a plan
    bool speed = false;  ///< there is a speed gate
};

class OscCommands {
  public:
    OscCommands(std::string secret, std::vector<std::string> gates, MoreCommands more = {})
        : secret_(std::move(secret)), gates_(std::move(gates)), more_(more) {}

    [[nodiscard]] OscVerdict read(std::span<const std::uint8_t> packet) const;

  private:
    std::string secret_;
    std::vector<std::string> gates_;
    MoreCommands more_;
};

} // namespace millpond
