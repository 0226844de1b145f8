#include "app/session_conditions.hpp"

namespace millpond {

std::optional<SessionAssignment> kept_assignment(const SessionReader& session) {
    const auto& more = session.provenance().about.more;
    if (!more.contains("assignment")) {
        return std::nullopt;
    }
    return read_session_assignment(more.at("assignment").dump(), session.folder().string() + ": provenance.json");
}

std::optional<SessionAssignment> known_assignment(const SessionReader& session) {
    auto kept = kept_assignment(session);
    if (kept && kept->sealed) {
        if (const auto told = read_unblinded(session.folder())) {
            kept->conditions = told->conditions;
        }
    }
    return kept;
}

} // namespace millpond
