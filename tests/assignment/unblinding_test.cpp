#include "assignment/unblinding.hpp"
#include "base/refusal.hpp"
#include "support/files.hpp"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

namespace millpond::test {
namespace {

Assignment sealed_list() {
    AssignmentPlan plan;
    plan.shares = {{Condition::disrupt, 1}, {Condition::delayed, 1}};
    plan.sessions = 4;
    plan.sealed = true;
    return make_assignment(plan, 5);
}

TEST(Unblinding, TellsTheConditionAndKeepsWhoAskedAndWhy) {
    const TemporaryFolder session;
    const auto list = sealed_list();
    const auto kept = session_assignment(list, list.sessions[2]);
    EXPECT_FALSE(read_unblinded(session.path()));
    unblind(session.path(), kept, list, {"A. Brook", "scoring is done", "2026-03-01T09:30:00.000000Z"});
    EXPECT_EQ(read_unblinded(session.path())->conditions, list.sessions[2].conditions);
    const auto json = nlohmann::json::parse(text_of(session / "unblinded.json"));
    EXPECT_EQ(json["unblinded"]["by"], "A. Brook");
    EXPECT_EQ(json["unblinded"]["why"], "scoring is done");
    EXPECT_EQ(json["unblinded"]["time"], "2026-03-01T09:30:00.000000Z");
}

TEST(Unblinding, HappensOnce) {
    const TemporaryFolder session;
    const auto list = sealed_list();
    const auto kept = session_assignment(list, list.sessions[0]);
    unblind(session.path(), kept, list, {"A", "b", "c"});
    EXPECT_THROW(unblind(session.path(), kept, list, {"A", "b", "c"}), Refusal);
}

TEST(Unblinding, WithAListThatWasExchangedIsRefused) {
    const TemporaryFolder session;
    auto list = sealed_list();
    const auto kept = session_assignment(list, list.sessions[0]);
    auto& listed = list.sessions[0].conditions[0];
    listed = listed == Condition::disrupt ? Condition::delayed : Condition::disrupt;
    EXPECT_THROW(unblind(session.path(), kept, list, {"A", "b", "c"}), Refusal);
    EXPECT_FALSE(std::filesystem::exists(session / "unblinded.json"));
}

TEST(SessionAssignment, KeepsNoConditionOfASealedList) {
    const auto list = sealed_list();
    const auto text = to_json_text(session_assignment(list, list.sessions[1]));
    EXPECT_EQ(text.find("disrupt"), std::string::npos);
    EXPECT_EQ(text.find("delayed"), std::string::npos);
    const auto read = read_session_assignment(text, "provenance.json");
    EXPECT_EQ(read.code, list.sessions[1].code);
    EXPECT_TRUE(read.conditions.empty());
    EXPECT_EQ(read.units, 1U);
    EXPECT_EQ(read.sha256, commitment(list.sessions[1]));
}

TEST(SessionAssignment, OfAnOpenListIsKeptWhole) {
    AssignmentPlan plan;
    plan.shares = {{Condition::disrupt, 1}, {Condition::none, 1}};
    plan.unit = AssignmentUnit::block;
    plan.block_minutes = 2.5;
    plan.units = 6;
    const auto list = make_assignment(plan, 0);
    const auto read = read_session_assignment(to_json_text(session_assignment(list, list.sessions[0])), "x");
    EXPECT_EQ(read.conditions, list.sessions[0].conditions);
    EXPECT_EQ(read.unit, AssignmentUnit::block);
    EXPECT_EQ(read.block_minutes, 2.5);
    EXPECT_THROW((void)read_session_assignment("{}", "x"), Refusal);
}

} // namespace
} // namespace millpond::test
