// Turns OSC messages into commands: /arm, /disarm, /mark TEXT, /gate NAME 1 or 0, /trial, each with the secret first
// where one is set. Thread: control.
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

class OscCommands {
  public:
    /// `trials`: whether the session has trials that somebody marks.
    OscCommands(std::string secret, std::vector<std::string> gates, bool trials = false)
        : secret_(std::move(secret)), gates_(std::move(gates)), trials_(trials) {}

    [[nodiscard]] OscVerdict read(std::span<const std::uint8_t> packet) const;

  private:
    std::string secret_;
    std::vector<std::string> gates_;
    bool trials_;
};

} // namespace millpond
