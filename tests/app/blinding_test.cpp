// A blinded session shows its condition to nobody: not while it runs, not in its folder, not in its audit.
#include "app/rig.hpp"
#include "assignment/assignment.hpp"

#include <algorithm>

namespace millpond::test {
namespace {

const std::vector<std::string> telling{"disrupt", "delayed", "yoked", "rate_matched"};

class Blinding : public ::testing::Test {
  protected:
    Rig::Played play(const std::vector<std::string>& more) {
        std::vector<std::string> words{MILLPOND_PROGRAM, "live", settings_, "--status-every-s", "0.2"};
        words.insert(words.end(), more.begin(), more.end());
        return rig_.play(std::move(words), recording_, frames);
    }

    /// A sealed list with one session of each condition; its codes in the order of `conditions`.
    std::vector<std::string> sealed_codes(const std::string& list) {
        const auto made = run_millpond(
            "assign make --conditions disrupt,delayed,yoked,rate_matched,none --sessions 5 --sealed --out " + list);
        EXPECT_EQ(made.status, 0) << made.err;
        std::vector<std::string> codes(5);
        for (const auto& session : read_assignment(list).sessions) {
            codes.at(static_cast<std::size_t>(session.conditions.front())) = session.code;
        }
        return codes;
    }

    static void expect_nothing_told(const std::string& text, const std::string& where) {
        for (const auto& word : telling) {
            EXPECT_EQ(text.find(word), std::string::npos) << where << " tells of " << word;
        }
    }

    static constexpr std::uint64_t frames = 11250; // 9 s
    Rig rig_;
    std::string recording_ = rig_.recording(9.0);
    std::string settings_ = rig_.settings({});
};

TEST_F(Blinding, NothingThatTheSessionShowsOrKeepsTellsItsCondition) {
    write_text(rig_ / "plan.tsv",
               "onset\tduration\ttrial_type\tsample\n4.0\t0\tscheduled\t5000\n6.0\t0\tscheduled\t7500\n");
    const auto codes = sealed_codes(rig_.path("rats.yaml"));
    std::vector<std::string> tables;
    std::vector<std::uint64_t> pulses;
    for (const auto& code : codes) {
        const auto [folder, shown] =
            play({"--assignment", rig_.path("rats.yaml"), "--code", code, "--schedule", rig_.path("plan.tsv")});
        expect_nothing_told(shown, "the terminal");
        EXPECT_EQ(shown.find("pulses"), std::string::npos) << "their number tells";
        for (const auto& file : std::filesystem::directory_iterator(folder)) {
            expect_nothing_told(text_of(file.path()), file.path().filename().string());
        }
        const auto audit = run_millpond("audit " + folder.string());
        EXPECT_EQ(audit.status, 0) << audit.err;
        expect_nothing_told(audit.out, "the audit");
        EXPECT_NE(audit.out.find("every decision reproduced"), std::string::npos) << audit.out;
        tables.push_back(text_of(folder / "events.tsv"));
        const auto events = SessionReader(folder).events();
        pulses.push_back(static_cast<std::uint64_t>(std::count_if(
            events.begin(), events.end(), [](const Event& event) { return event.kind == EventKind::pulse; })));
    }
    // Same samples, same table, whatever the condition; only the pulses, which the table leaves out, were not the same.
    for (const auto& table : tables) {
        EXPECT_EQ(table, tables.front());
    }
    EXPECT_GT(pulses[0], 2U) << "disrupt";
    EXPECT_GT(pulses[1], 2U) << "delayed";
    EXPECT_EQ(pulses[2], 2U) << "yoked";
    EXPECT_EQ(pulses[3], 2U) << "rate_matched";
    EXPECT_EQ(pulses[4], 0U) << "none";
}

TEST_F(Blinding, UnblindingTellsTheAuditAndIsKept) {
    const auto codes = sealed_codes(rig_.path("rats.yaml"));
    write_text(rig_ / "plan.tsv", "onset\tduration\ttrial_type\tsample\n4.0\t0\tscheduled\t5000\n");
    const auto [folder, shown] =
        play({"--assignment", rig_.path("rats.yaml"), "--code", codes[0], "--schedule", rig_.path("plan.tsv")});
    EXPECT_EQ(rig_.audit(folder)["decisions"]["pulses"], nullptr);
    const auto command = "unblind " + folder.string() + " --list " + rig_.path("rats.yaml") + " --by me --why test";
    const auto told = run_millpond(command);
    EXPECT_EQ(told.status, 0) << told.err;
    EXPECT_NE(told.out.find("disrupt"), std::string::npos) << told.out;
    const auto audit = rig_.audit(folder);
    EXPECT_EQ(audit["conditions"][0]["condition"], "disrupt");
    EXPECT_GT(audit["decisions"]["pulses"], 2);
    EXPECT_TRUE(audit["objections"].empty()) << audit["objections"];
    EXPECT_EQ(run_millpond(command).status, 2) << "once only";
}

TEST_F(Blinding, TrialsOfAnOpenListChangeTheConditionAtTheirMarks) {
    const auto made = run_millpond("assign make --conditions disrupt,none --unit trial --units 4 --sessions 1 --out " +
                                   rig_.path("trials.yaml"));
    ASSERT_EQ(made.status, 0) << made.err;
    const auto list = read_assignment(rig_.path("trials.yaml"));
    RigSettings want;
    want.control = true;
    const auto settings = rig_.settings(want, "trials_rig.yaml");
    const auto session = rig_.start({MILLPOND_PROGRAM, "live", settings, "--assignment", rig_.path("trials.yaml"),
                                     "--code", list.sessions[0].code});
    ASSERT_TRUE(session->says("session folder ")) << session->err();
    const auto folder = Rig::folder_of(*session);
    const auto feed = rig_.feed(recording_, {"--speed", "2"});
    ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(folder) >= frames / 2; }));
    run("oscsend localhost " + std::to_string(rig_.control_port()) + " /trial");
    EXPECT_EQ(feed->status(), 0);
    ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(folder) >= frames; }));
    session->send(SIGINT);
    EXPECT_EQ(session->status(), 0) << session->err();
    EXPECT_EQ(rows_of(folder / "events.tsv", "trial").size(), 2U);
    const auto audit = rig_.audit(folder);
    EXPECT_TRUE(audit["objections"].empty()) << audit["objections"];
    ASSERT_EQ(audit["conditions"].size(), 2U);
    for (const auto& condition : audit["conditions"]) {
        EXPECT_EQ(condition["pulses"], condition["condition"] == "disrupt" ? condition["triggers"] : nlohmann::json(0));
        EXPECT_GT(condition["triggers"], 0);
    }
}

TEST_F(Blinding, ConditionInTheSettingsBesideAListIsRefused) {
    sealed_codes(rig_.path("rats.yaml"));
    const auto ran =
        run_millpond("live " + settings_ + " --condition none --assignment " + rig_.path("rats.yaml") + " --code AAAA");
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("arbiter.condition: found none; allowed: assigned"), std::string::npos) << ran.err;
    const auto unknown = run_millpond("live " + settings_ + " --assignment " + rig_.path("rats.yaml") + " --code ----");
    EXPECT_EQ(unknown.status, 2);
    EXPECT_NE(unknown.err.find("assignment.code: found code '----'"), std::string::npos) << unknown.err;
    EXPECT_FALSE(std::filesystem::exists(rig_ / "sessions"));
}

} // namespace
} // namespace millpond::test
