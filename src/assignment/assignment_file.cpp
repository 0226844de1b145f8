// The list in a file: YAML. Sealed, each session's conditions are masked by numbers that its salt gives. That keeps
// them from being read by accident, in an editor or over a shoulder; it does not keep anyone from working at it.
#include "assignment/assignment.hpp"
#include "base/random.hpp"
#include "base/refusal.hpp"
#include "recording/whole_file.hpp"
#include "settings/yaml_reader.hpp"
#include "settings/yaml_writer.hpp"

#include <fmt/format.h>

namespace millpond {
namespace {

constexpr std::uint64_t mask_stream = 3; // of base/random.hpp

struct WrittenSession {
    std::string code, salt, conditions, sha256;
};

template <class Visitor> void describe(Visitor& visit, WrittenSession& session) {
    visit.text("code", session.code, "what the operator calls the session");
    visit.text("salt", session.salt, "32 hexadecimal digits");
    visit.text("conditions", session.conditions, "of its units, in order: words, or masked where the list is sealed");
    visit.text("sha256", session.sha256, "checksum over salt, code and conditions");
}

struct WrittenAssignment {
    AssignmentUnit unit = AssignmentUnit::session;
    double block_minutes = 0.0;
    bool sealed = false;
    std::uint64_t seed = 0;
    std::vector<WrittenSession> sessions;
};

template <class Visitor> void describe(Visitor& visit, WrittenAssignment& list) {
    visit.choice("unit", list.unit, assignment_units, "what one condition lasts for");
    visit.number("block_minutes", list.block_minutes, {0.0, 1e5}, "length of a block (unit: block)");
    visit.flag("sealed", list.sealed, "whether the conditions are masked");
    visit.whole("seed", list.seed, {0, 9007199254740992.0}, "of the draws; 0 where the list is sealed");
    visit.list("sessions", list.sessions, "the list");
}

// One byte a condition, so that masked lists of one length look alike.
std::string mask(const AssignedSession& session) {
    Random random(std::stoull(session.salt.substr(0, 16), nullptr, 16), mask_stream);
    std::string hex;
    for (const auto condition : session.conditions) {
        hex += fmt::format("{:02x}", (static_cast<unsigned>(condition) ^ random.bits()) & 0xFFU);
    }
    return hex;
}

std::vector<Condition> unmask(const WrittenSession& written, const std::string& where) {
    Random random(std::stoull(written.salt.substr(0, 16), nullptr, 16), mask_stream);
    std::vector<Condition> list;
    for (std::size_t i = 0; i + 1 < written.conditions.size(); i += 2) {
        const auto byte = std::stoul(written.conditions.substr(i, 2), nullptr, 16);
        const auto condition = static_cast<Condition>((byte ^ random.bits()) & 0xFFU);
        if (word_for<Condition>(conditions, condition).empty()) {
            throw Refusal(where, "conditions that cannot be unmasked", "a list as `assign make` wrote it");
        }
        list.push_back(condition);
    }
    return list;
}

std::string words_of(const std::vector<Condition>& list) {
    std::string words;
    for (const auto condition : list) {
        words += words.empty() ? "" : " ";
        words += word_for<Condition>(conditions, condition);
    }
    return words;
}

std::vector<Condition> read_words(const std::string& words, const std::string& where) {
    std::vector<Condition> list;
    for (std::size_t from = 0; from < words.size();) {
        const auto end = std::min(words.find(' ', from), words.size());
        const auto word = std::string_view(words).substr(from, end - from);
        const auto* known = std::find_if(std::begin(conditions), std::end(conditions),
                                         [word](const auto& choice) { return choice.word == word; });
        if (known == std::end(conditions) || known->value == Condition::assigned) {
            throw Refusal(where, "'" + std::string(word) + "'", "disrupt, delayed, yoked, rate_matched or none");
        }
        list.push_back(known->value);
        from = end + 1;
    }
    return list;
}

bool is_hex(const std::string& text) {
    return text.find_first_not_of("0123456789abcdef") == std::string::npos;
}

AssignedSession read_session(const WrittenSession& written, bool sealed, const std::string& where) {
    if (written.salt.size() != 32 || !is_hex(written.salt)) {
        throw Refusal(where + ".salt", "'" + written.salt + "'", "32 hexadecimal digits");
    }
    if (sealed && (!is_hex(written.conditions) || written.conditions.size() % 2 != 0)) {
        throw Refusal(where + ".conditions", "'" + written.conditions + "'", "pairs of hexadecimal digits: sealed");
    }
    AssignedSession session{written.code, written.salt, {}};
    session.conditions = sealed ? unmask(written, where) : read_words(written.conditions, where + ".conditions");
    if (session.conditions.empty() || commitment(session) != written.sha256) {
        throw Refusal(where + ".sha256", "'" + written.sha256 + "'",
                      "the checksum of salt, code and conditions: the list was changed after it was made");
    }
    return session;
}

} // namespace

void write_assignment(const std::filesystem::path& file, const Assignment& assignment) {
    if (std::filesystem::exists(file)) {
        throw Refusal(file.string(), "a file that exists", "a new name: a list is never written over");
    }
    WrittenAssignment written{assignment.unit, assignment.block_minutes, assignment.sealed, assignment.seed, {}};
    for (const auto& session : assignment.sessions) {
        written.sessions.push_back({session.code, session.salt,
                                    assignment.sealed ? mask(session) : words_of(session.conditions),
                                    commitment(session)});
    }
    write_whole_file(file, to_yaml(written));
}

Assignment read_assignment(const std::filesystem::path& file) {
    const auto written = read_yaml_file<WrittenAssignment>(file);
    if (written.sessions.empty()) {
        throw Refusal(file.string() + ": sessions", "none", "one or more");
    }
    Assignment assignment{written.unit, written.block_minutes, written.seed, written.sealed, {}};
    for (std::size_t i = 0; i < written.sessions.size(); ++i) {
        assignment.sessions.push_back(
            read_session(written.sessions[i], written.sealed, fmt::format("{}: sessions[{}]", file.string(), i)));
    }
    return assignment;
}

} // namespace millpond
