#include "assignment/assignment.hpp"
#include "base/refusal.hpp"
#include "support/files.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <map>

namespace millpond::test {
namespace {

AssignmentPlan plan_of(std::vector<ConditionShare> shares, std::uint32_t sessions, bool sealed = false) {
    AssignmentPlan plan;
    plan.shares = std::move(shares);
    plan.sessions = sessions;
    plan.sealed = sealed;
    return plan;
}

const std::vector<ConditionShare> two{{Condition::disrupt, 1}, {Condition::delayed, 1}};

std::vector<Condition> order_of(const Assignment& assignment) {
    std::vector<Condition> order;
    for (const auto& session : assignment.sessions) {
        order.insert(order.end(), session.conditions.begin(), session.conditions.end());
    }
    return order;
}

std::string refusal_of(const std::filesystem::path& file) {
    try {
        (void)read_assignment(file);
    } catch (const Refusal& refusal) {
        return refusal.what();
    }
    return "not refused";
}

TEST(Assignment, EveryPermutedBlockHoldsEachConditionByItsShare) {
    const auto order = order_of(
        make_assignment(plan_of({{Condition::disrupt, 2}, {Condition::delayed, 1}, {Condition::none, 1}}, 40), 0));
    ASSERT_EQ(order.size(), 40U);
    for (std::size_t block = 0; block < order.size(); block += 4) {
        std::map<Condition, int> counted;
        for (std::size_t i = 0; i < 4; ++i) {
            ++counted[order[block + i]];
        }
        EXPECT_EQ(counted,
                  (std::map<Condition, int>{{Condition::disrupt, 2}, {Condition::delayed, 1}, {Condition::none, 1}}));
    }
}

TEST(Assignment, AllOrdersOfABlockAreDrawnEquallyOften) {
    // Six orders of three conditions over 6000 blocks. Pearson's chi-squared, 5 degrees of freedom: 20.5 is its 99.9 %
    // point (SciPy chi2.ppf).
    const auto order = order_of(
        make_assignment(plan_of({{Condition::disrupt, 1}, {Condition::delayed, 1}, {Condition::none, 1}}, 9999), 0));
    std::map<std::vector<Condition>, double> counted;
    for (std::size_t block = 0; block + 3 <= order.size(); block += 3) {
        ++counted[{order.begin() + static_cast<std::ptrdiff_t>(block),
                   order.begin() + static_cast<std::ptrdiff_t>(block + 3)}];
    }
    ASSERT_EQ(counted.size(), 6U);
    double chi2 = 0.0;
    for (const auto& [unused, count] : counted) {
        chi2 += (count - 555.5) * (count - 555.5) / 555.5;
    }
    EXPECT_LT(chi2, 20.5);
}

TEST(Assignment, TheSameSeedGivesTheSameListAndAnotherOneAnother) {
    auto plan = plan_of(two, 30);
    const auto once = make_assignment(plan, 0), again = make_assignment(plan, 0);
    EXPECT_EQ(order_of(once), order_of(again));
    EXPECT_EQ(once.sessions[3].code, again.sessions[3].code);
    plan.seed = 2;
    EXPECT_NE(order_of(make_assignment(plan, 0)), order_of(once));
}

TEST(Assignment, ASealedListDoesNotFollowTheSeed) {
    const auto plan = plan_of(two, 30, true);
    EXPECT_NE(order_of(make_assignment(plan, 11)), order_of(make_assignment(plan, 12)));
    EXPECT_EQ(make_assignment(plan, 11).seed, 0U);
}

TEST(Assignment, TrialsAreBalancedWithinEachSession) {
    auto plan = plan_of(two, 3);
    plan.unit = AssignmentUnit::trial;
    plan.units = 20;
    for (const auto& session : make_assignment(plan, 0).sessions) {
        EXPECT_EQ(std::count(session.conditions.begin(), session.conditions.end(), Condition::disrupt), 10);
    }
}

TEST(Assignment, IsReadBackFromItsFileOpenAndSealed) {
    const TemporaryFolder temp;
    for (const bool sealed : {false, true}) {
        const auto made = make_assignment(plan_of(two, 12, sealed), 77);
        const auto file = temp / (sealed ? "sealed.yaml" : "open.yaml");
        write_assignment(file, made);
        const auto read = read_assignment(file);
        EXPECT_EQ(order_of(read), order_of(made));
        EXPECT_EQ(read.sealed, sealed);
        EXPECT_EQ(read.sessions[5].code, made.sessions[5].code);
        EXPECT_EQ(commitment(read.sessions[5]), commitment(made.sessions[5]));
    }
}

TEST(Assignment, ASealedFileShowsNoConditionAndNothingThatTellsTwoApart) {
    const TemporaryFolder temp;
    write_assignment(temp / "sealed.yaml", make_assignment(plan_of(two, 12, true), 77));
    const auto text = text_of(temp / "sealed.yaml");
    for (const auto& choice : conditions) {
        if (choice.value != Condition::assigned) {
            EXPECT_EQ(text.find(choice.word), std::string::npos) << choice.word;
        }
    }
}

TEST(Assignment, ChecksumIsThatOfPythonsHashlib) {
    const AssignedSession session{"K7QF", "00112233445566778899aabbccddeeff", {Condition::disrupt, Condition::none}};
    EXPECT_EQ(commitment(session) + "\n",
              python("import hashlib\n"
                     "print(hashlib.sha256(b'00112233445566778899aabbccddeeff K7QF disrupt none').hexdigest())\n"));
}

TEST(Assignment, AListThatWasChangedIsRefused) {
    const TemporaryFolder temp;
    write_assignment(temp / "list.yaml", make_assignment(plan_of({{Condition::disrupt, 1}}, 2), 0));
    auto text = text_of(temp / "list.yaml");
    text.replace(text.find("disrupt"), 7, "delayed");
    write_text(temp / "changed.yaml", text);
    EXPECT_NE(refusal_of(temp / "changed.yaml").find("sessions[0].sha256"), std::string::npos)
        << refusal_of(temp / "changed.yaml");
    EXPECT_NE(refusal_of(temp / "changed.yaml").find("changed after it was made"), std::string::npos);
}

TEST(Assignment, OtherBadListsAreRefusedByPlace) {
    const TemporaryFolder temp;
    const auto refused = [&](const std::string& text) { return refusal_of(temp.file("bad.yaml", text)); };
    EXPECT_NE(refused("unit: session\n").find("sessions: found none"), std::string::npos);
    EXPECT_NE(refused("unit: week\nsessions: []\n").find("unit"), std::string::npos);
    const std::string head = "unit: session\nsessions:\n  - {code: AAAA, salt: ";
    EXPECT_NE(refused(head + "12, conditions: none, sha256: a}\n").find("sessions[0].salt"), std::string::npos);
    const std::string salt = "00112233445566778899aabbccddeeff";
    EXPECT_NE(refused(head + salt + ", conditions: sham, sha256: a}\n").find("found 'sham'"), std::string::npos);
    EXPECT_NE(refused("sealed: true\n" + head + salt + ", conditions: zz, sha256: a}\n").find("hexadecimal"),
              std::string::npos);
    EXPECT_NE(refused("unit: session\ncolour: red\n").find("colour"), std::string::npos);
}

TEST(Assignment, AListIsNeverWrittenOver) {
    const TemporaryFolder temp;
    const auto made = make_assignment(plan_of(two, 2), 0);
    write_assignment(temp / "list.yaml", made);
    EXPECT_THROW(write_assignment(temp / "list.yaml", made), Refusal);
}

TEST(Assignment, PlansThatMakeNoSenseAreRefused) {
    EXPECT_THROW((void)make_assignment(plan_of({}, 2), 0), Refusal);
    EXPECT_THROW((void)make_assignment(plan_of({{Condition::none, 1}, {Condition::none, 1}}, 2), 0), Refusal);
    EXPECT_THROW((void)make_assignment(plan_of({{Condition::assigned, 1}}, 2), 0), Refusal);
    EXPECT_THROW((void)make_assignment(plan_of({{Condition::none, 0}}, 2), 0), Refusal);
}

TEST(Assignment, AnUnknownCodeIsRefusedWithTheNearestOne) {
    auto made = make_assignment(plan_of(two, 2), 0);
    made.sessions[0].code = "K7QF";
    made.sessions[1].code = "HHHH";
    EXPECT_EQ(session_of(made, "HHHH", "rig").code, "HHHH");
    try {
        (void)session_of(made, "K7QE", "rig.yaml: assignment.code");
        FAIL();
    } catch (const Refusal& refusal) {
        EXPECT_STREQ(refusal.what(), "rig.yaml: assignment.code: found code 'K7QE'; allowed: did you mean 'K7QF'?");
    }
}

} // namespace
} // namespace millpond::test
