// Which session, block or trial has which condition: drawn before the experiment by permuted blocks, so that conditions
// stay balanced all along, and sealed where the people who handle the animal must not know. A session is known by a
// code. Thread: control.
#pragma once

#include "arbiter/arbiter_settings.hpp"
#include "base/describe.hpp"

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

/// What one condition lasts for.
enum class AssignmentUnit : std::uint8_t {
    session, ///< a whole session
    block,   ///< so many minutes of the stream
    trial    ///< from one trial mark to the next
};
inline constexpr Choice<AssignmentUnit> assignment_units[] = {
    {AssignmentUnit::session, "session"}, {AssignmentUnit::block, "block"}, {AssignmentUnit::trial, "trial"}};

struct ConditionShare {
    Condition condition{};
    std::uint32_t share = 1; ///< how often it stands in each permuted block
};

struct AssignmentPlan {
    std::vector<ConditionShare> shares;
    AssignmentUnit unit = AssignmentUnit::session;
    std::uint32_t sessions = 1;
    std::uint32_t units = 1;    ///< blocks or trials in each session; 1 where the unit is the session
    double block_minutes = 0.0; ///< where the unit is the block
    std::uint64_t seed = 1;     ///< the same seed, the same list
    bool sealed = false;        ///< conditions are masked in the file; `seed` is not kept
};

struct AssignedSession {
    std::string code;                  ///< four characters, drawn at random: they tell no order
    std::string salt;                  ///< 32 hexadecimal digits
    std::vector<Condition> conditions; ///< of its units, in order
};

struct Assignment {
    AssignmentUnit unit = AssignmentUnit::session;
    double block_minutes = 0.0;
    std::uint64_t seed = 0; ///< 0 where it is sealed
    bool sealed = false;
    std::vector<AssignedSession> sessions;

    /// Whether any session has it.
    [[nodiscard]] bool has(Condition condition) const noexcept;
};

/// Permuted blocks over sessions or, where the unit is smaller, over the units of each session: a permuted block holds
/// each condition as often as its share says, in random order; the last one may be cut. A sealed list takes its codes
/// and salts from `secret`, which nobody may be able to repeat; an open one from the seed. Refuses plans without a
/// condition, with one twice, and conditions that are not to be drawn (assigned).
[[nodiscard]] Assignment make_assignment(const AssignmentPlan& plan, std::uint64_t secret);

/// Writes the list; refuses a file that exists.
void write_assignment(const std::filesystem::path& file, const Assignment& assignment);
/// Refuses what `write_assignment` does not make, and lists whose conditions do not fit their checksum.
[[nodiscard]] Assignment read_assignment(const std::filesystem::path& file);

/// The session of that code. Refuses an unknown one, with the nearest known.
[[nodiscard]] const AssignedSession& session_of(const Assignment& assignment, const std::string& code,
                                                const std::string& where);

/// SHA-256 (FIPS 180-4) over salt, code and conditions, hexadecimal: what a session keeps, so that nobody can exchange
/// the list afterwards. Without the salt, which stays in the list's file, it tells nothing.
[[nodiscard]] std::string commitment(const AssignedSession& session);

} // namespace millpond
