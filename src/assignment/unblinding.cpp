#include "assignment/unblinding.hpp"

#include "base/refusal.hpp"
#include "recording/whole_file.hpp"

#include <nlohmann/json.hpp>

namespace millpond {
namespace {

using Json = nlohmann::json;

constexpr const char* unblinded_name = "unblinded.json";

template <class Enum, std::size_t N>
Enum read_word(const Json& word, const Choice<Enum> (&choices)[N], const std::string& where) {
    const auto text = word.get<std::string>();
    for (const auto& choice : choices) {
        if (choice.word == text) {
            return choice.value;
        }
    }
    throw Refusal(where, "'" + text + "'", "a word that this program writes there");
}

Json to_json(const SessionAssignment& assignment) {
    Json json{{"code", assignment.code},
              {"unit", word_for<AssignmentUnit>(assignment_units, assignment.unit)},
              {"block_minutes", assignment.block_minutes},
              {"units", assignment.units},
              {"sealed", assignment.sealed},
              {"sha256", assignment.sha256}};
    if (!assignment.conditions.empty()) {
        json["conditions"] = Json::array();
        for (const auto condition : assignment.conditions) {
            json["conditions"].push_back(word_for<Condition>(conditions, condition));
        }
    }
    return json;
}

} // namespace

SessionAssignment session_assignment(const Assignment& assignment, const AssignedSession& session) {
    SessionAssignment kept{session.code,
                           assignment.unit,
                           assignment.block_minutes,
                           session.conditions.size(),
                           assignment.sealed,
                           commitment(session),
                           {}};
    if (!assignment.sealed) {
        kept.conditions = session.conditions;
    }
    return kept;
}

std::string to_json_text(const SessionAssignment& assignment) {
    return to_json(assignment).dump(2);
}

SessionAssignment read_session_assignment(const std::string& text, const std::string& where) {
    try {
        const auto json = Json::parse(text);
        SessionAssignment read;
        read.code = json.at("code").get<std::string>();
        read.unit = read_word(json.at("unit"), assignment_units, where + ": unit");
        read.block_minutes = json.at("block_minutes").get<double>();
        read.units = json.at("units").get<std::size_t>();
        read.sealed = json.at("sealed").get<bool>();
        read.sha256 = json.at("sha256").get<std::string>();
        for (const auto& word : json.value("conditions", Json::array())) {
            read.conditions.push_back(read_word(word, conditions, where + ": conditions"));
        }
        return read;
    } catch (const Json::exception& trouble) {
        throw Refusal(where, trouble.what(), "an assignment as a session keeps it");
    }
}

void unblind(const std::filesystem::path& session_folder, SessionAssignment kept, const Assignment& list,
             const Unblinding& asked) {
    const auto file = session_folder / unblinded_name;
    const auto& session = session_of(list, kept.code, session_folder.string());
    if (const auto sum = commitment(session); sum != kept.sha256) {
        throw Refusal(session_folder.string(), "checksum " + kept.sha256,
                      sum + ", that of code " + kept.code + " in the list: this is not the list it was run with");
    }
    if (std::filesystem::exists(file)) {
        throw Refusal(file.string(), "a session that has been unblinded", "one that has not: see who asked and why");
    }
    kept.conditions = session.conditions;
    auto json = to_json(kept);
    json["unblinded"] = {{"by", asked.by}, {"why", asked.why}, {"time", asked.time}};
    write_whole_file(file, json.dump(2) + "\n");
}

std::optional<SessionAssignment> read_unblinded(const std::filesystem::path& session_folder) {
    const auto file = session_folder / unblinded_name;
    if (!std::filesystem::exists(file)) {
        return std::nullopt;
    }
    return read_session_assignment(read_whole_file(file), file.string());
}

} // namespace millpond
