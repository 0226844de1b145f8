// The condition of a blinded session, told once and for the record. Thread: control, cold.
#pragma once

#include "assignment/assignment.hpp"

#include <filesystem>
#include <optional>
#include <string>

namespace millpond {

/// What a session keeps of its assignment, in its provenance: enough to run it again but for the pulses.
struct SessionAssignment {
    std::string code;
    AssignmentUnit unit{};
    double block_minutes = 0.0;
    std::size_t units = 1;
    bool sealed = false;
    std::string sha256;
    std::vector<Condition> conditions; ///< empty while it is sealed
};

[[nodiscard]] SessionAssignment session_assignment(const Assignment& assignment, const AssignedSession& session);

/// As text of one JSON object; `conditions` is left out of a sealed one.
[[nodiscard]] std::string to_json_text(const SessionAssignment& assignment);
/// Refuses what `to_json_text` does not make. `where` names the file.
[[nodiscard]] SessionAssignment read_session_assignment(const std::string& text, const std::string& where);

/// Why somebody wants to know.
struct Unblinding {
    std::string by, why;
    std::string time; ///< UTC
};

/// Writes `unblinded.json` into the session's folder: the conditions, and who asked when and why. Refuses a list whose
/// checksum is not the one that the session kept, and a session that has been told already.
void unblind(const std::filesystem::path& session_folder, SessionAssignment kept, const Assignment& list,
             const Unblinding& asked);

/// The conditions of a session that has been told; empty where it has not.
[[nodiscard]] std::optional<SessionAssignment> read_unblinded(const std::filesystem::path& session_folder);

} // namespace millpond
