// What a session says of its assignment, and what may be told of it. Thread: cold.
#pragma once

#include "assignment/unblinding.hpp"
#include "journal/session_reader.hpp"

#include <optional>

namespace millpond {

/// As the session kept it; empty where its condition stood in the settings.
[[nodiscard]] std::optional<SessionAssignment> kept_assignment(const SessionReader& session);

/// The same, with the conditions where the session was unblinded since.
[[nodiscard]] std::optional<SessionAssignment> known_assignment(const SessionReader& session);

} // namespace millpond
