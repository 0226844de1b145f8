#include "assignment/assignment.hpp"

#include "base/random.hpp"
#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <openssl/evp.h>
#include <set>

namespace millpond {
namespace {

constexpr std::uint64_t order_stream = 1, code_stream = 2; // of base/random.hpp

std::uint64_t below(Random& random, std::uint64_t count) {
    return std::min(count - 1, static_cast<std::uint64_t>(random.uniform() * static_cast<double>(count)));
}

void check_plan(const AssignmentPlan& plan) {
    if (plan.shares.empty()) {
        throw Refusal("assignment", "no condition", "one or more");
    }
    std::set<Condition> seen;
    for (const auto& each : plan.shares) {
        const std::string word(word_for<Condition>(conditions, each.condition));
        if (each.condition == Condition::assigned) {
            throw Refusal("assignment", word, "a condition that says what becomes of triggers");
        }
        if (!seen.insert(each.condition).second) {
            throw Refusal("assignment", word + " twice", "each condition once; shares say how often it is drawn");
        }
        if (each.share == 0) {
            throw Refusal("assignment", word + " with share 0", "shares of 1 and more");
        }
    }
}

// Permuted blocks, one after another, as many as are needed.
std::vector<Condition> draw(const AssignmentPlan& plan, std::size_t count, Random& random) {
    std::vector<Condition> drawn;
    while (drawn.size() < count) {
        std::vector<Condition> block;
        for (const auto& each : plan.shares) {
            block.insert(block.end(), each.share, each.condition);
        }
        for (std::size_t left = block.size(); left > 1; --left) { // Fisher & Yates
            std::swap(block[left - 1], block[below(random, left)]);
        }
        drawn.insert(drawn.end(), block.begin(), block.end());
    }
    drawn.resize(count);
    return drawn;
}

// Letters and digits that nobody takes for another.
std::string draw_code(Random& random) {
    constexpr std::string_view alphabet = "ACDEFGHJKLMNPQRTUVWXY34679";
    std::string code;
    for (int i = 0; i < 4; ++i) {
        code += alphabet[below(random, alphabet.size())];
    }
    return code;
}

} // namespace

bool Assignment::has(Condition condition) const noexcept {
    return std::any_of(sessions.begin(), sessions.end(), [condition](const auto& session) {
        return std::find(session.conditions.begin(), session.conditions.end(), condition) != session.conditions.end();
    });
}

Assignment make_assignment(const AssignmentPlan& plan, std::uint64_t secret) {
    check_plan(plan);
    Assignment made;
    made.unit = plan.unit;
    made.block_minutes = plan.unit == AssignmentUnit::block ? plan.block_minutes : 0.0;
    made.sealed = plan.sealed;
    made.seed = plan.sealed ? 0 : plan.seed;
    const std::uint64_t source = plan.sealed ? secret : plan.seed;
    Random order(source, order_stream), codes(source, code_stream);
    const bool whole_sessions = plan.unit == AssignmentUnit::session;
    const auto over_sessions = draw(plan, whole_sessions ? plan.sessions : 0, order);
    std::set<std::string> used;
    for (std::uint32_t i = 0; i < plan.sessions; ++i) {
        AssignedSession session;
        do {
            session.code = draw_code(codes);
        } while (!used.insert(session.code).second);
        session.salt = fmt::format("{:016x}{:016x}", codes.bits(), codes.bits());
        session.conditions = whole_sessions ? std::vector{over_sessions[i]} : draw(plan, plan.units, order);
        made.sessions.push_back(std::move(session));
    }
    return made;
}

const AssignedSession& session_of(const Assignment& assignment, const std::string& code, const std::string& where) {
    const auto found = std::find_if(assignment.sessions.begin(), assignment.sessions.end(),
                                    [&code](const auto& session) { return session.code == code; });
    if (found == assignment.sessions.end()) {
        std::vector<std::string> known;
        for (const auto& session : assignment.sessions) {
            known.push_back(session.code);
        }
        const auto near = nearest_name(code, known);
        throw Refusal(where, "code '" + code + "'",
                      near.empty() ? "a code of the list: `assign show` names them" : "did you mean '" + near + "'?");
    }
    return *found;
}

std::string commitment(const AssignedSession& session) {
    std::string text = session.salt + " " + session.code;
    for (const auto condition : session.conditions) {
        text += " ";
        text += word_for<Condition>(conditions, condition);
    }
    std::array<unsigned char, EVP_MAX_MD_SIZE> digest{};
    unsigned int bytes = 0;
    if (EVP_Digest(text.data(), text.size(), digest.data(), &bytes, EVP_sha256(), nullptr) != 1) {
        throw std::runtime_error("SHA-256 is not to be had from libcrypto");
    }
    std::string hex;
    for (unsigned int i = 0; i < bytes; ++i) {
        hex += fmt::format("{:02x}", digest[i]);
    }
    return hex;
}

} // namespace millpond
