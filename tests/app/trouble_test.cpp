// What goes wrong during a session: a full disk, a sender that stops, packets that never arrive.
#include "app/rig.hpp"

#include <sys/mount.h>

namespace millpond::test {
namespace {

/// A session on a disk that fills up, streamed until well after; gives what it printed and left behind.
void expect_faulted_but_watching(Rig& rig, Process& session, const std::string& why) {
    const auto sender = rig.feed(rig.recording(60.0), {"--speed", "8", "--loop"});
    ASSERT_TRUE(session.says("millpond: faulted (journal failed)\n")) << session.err();
    ASSERT_TRUE(session.says(why)) << session.err();
    // Goes on detecting: withheld by rule `faulted` is told in the summary; detections go on counting in the status
    // line.
    const auto detections = [&] {
        const auto text = session.err();
        const auto at = text.rfind("detections ");
        return at == std::string::npos ? 0L : std::strtol(text.c_str() + at + 11, nullptr, 10);
    };
    const auto at_fault = detections();
    EXPECT_TRUE(wait_until([&] { return detections() > at_fault + 3; })) << session.err();
    EXPECT_NE(session.err().rfind("TROUBLE: "), std::string::npos);
    session.send(SIGINT);
    EXPECT_EQ(session.status(), 1) << session.err();
    EXPECT_NE(session.out().find("withheld, faulted: "), std::string::npos) << session.out();
}

void expect_readable(const std::filesystem::path& folder) {
    const auto ran = run_millpond("audit " + folder.string() + " --json");
    ASSERT_TRUE(ran.status == 0 || ran.status == 1) << ran.err;
    const auto audit = nlohmann::json::parse(ran.out);
    EXPECT_GT(audit.at("records").at("intact").get<int>(), 10);
    EXPECT_TRUE(audit.at("records").at("damaged").empty());
    EXPECT_TRUE(audit.at("rerun").at("done")) << audit.at("rerun");
    EXPECT_TRUE(audit.at("rerun").at("reproduced")) << audit.at("rerun");
    EXPECT_GT(audit.at("decisions").at("detections").get<int>(), 0);
}

// RLIMIT_FSIZE: the kernel refuses to let a file grow beyond it, as a full disk would (setrlimit(2): EFBIG).
TEST(FullDisk, AFileThatMayNotGrowFaultsTheSessionWhichGoesOnDetecting) {
    Rig rig;
    const auto session = rig.live(rig.settings({}), {"/dev/null", {}, 250'000});
    expect_faulted_but_watching(rig, *session, "the disk did not take the session's samples");
    expect_readable(Rig::folder_of(*session));
}

TEST(FullDisk, ADiskOf3MegabytesFaultsTheSessionWhichGoesOnDetecting) {
    Rig rig;
    const auto disk = rig / "disk";
    std::filesystem::create_directories(disk);
    if (::mount("tmpfs", disk.c_str(), "tmpfs", 0, "size=3m") != 0) {
        GTEST_SKIP() << "SKIPPED LOUDLY: this user may not mount, a small disk was not tried";
    }
    RigSettings want;
    want.folder = "disk";
    const auto session = rig.live(rig.settings(want));
    expect_faulted_but_watching(rig, *session, "millpond: ");
    expect_readable(Rig::folder_of(*session));
    ::umount2(disk.c_str(), MNT_DETACH);
}

TEST(StaleStream, DisarmsAndStaysNotArmedUntilToldByCommand) {
    if (!has_program("oscsend")) {
        GTEST_SKIP() << "SKIPPED LOUDLY: no oscsend (Debian: liblo-tools)";
    }
    Rig rig;
    RigSettings want;
    want.control = true;
    want.stale_after_ms = 1500.0;
    const auto recording = rig.recording(20.0);
    const auto session = rig.live(rig.settings(want));
    const auto folder = Rig::folder_of(*session);
    EXPECT_EQ(rig.feed(recording, {"--speed", "8"})->status(), 0);
    ASSERT_TRUE(session->says("millpond: not armed (stale stream)\n")) << session->err();

    const auto before = Rig::frames_stored(folder);
    const auto seen_since = [&](EventKind kind) {
        const SessionReader read(folder);
        return std::count_if(read.events().begin(), read.events().end(),
                             [&](const Event& event) { return event.kind == kind && event.sample.value >= before; });
    };
    const auto sender = rig.feed(recording, {"--speed", "8", "--loop"});
    ASSERT_TRUE(wait_until([&] { return seen_since(EventKind::withheld) >= 5; })) << session->err();
    run("oscsend localhost " + std::to_string(rig.control_port()) + " /arm");
    ASSERT_TRUE(wait_until([&] { return seen_since(EventKind::pulse) >= 2; })) << session->err();
    session->send(SIGINT);
    EXPECT_EQ(session->status(), 0) << session->err();

    const auto audit = rig.audit(folder);
    std::vector<std::string> causes;
    std::uint64_t commanded_at = 0;
    for (const auto& state : audit.at("stream").at("states")) {
        causes.push_back(state.at("after").get<std::string>() + " by " + state.at("cause").get<std::string>());
        commanded_at = state.at("cause") == "command" ? state.at("sample").get<std::uint64_t>() : commanded_at;
    }
    EXPECT_EQ(causes, (std::vector<std::string>{"armed by start", "not armed by stale stream", "armed by command",
                                                "not armed by session end"}));
    std::size_t before_stale = 0, while_not_armed = 0, after_command = 0;
    for (const auto& row : rows_of(folder / "events.tsv", "pulse")) {
        const auto at = std::stoull(row.at("sample"));
        ++(at < before ? before_stale : at < commanded_at ? while_not_armed : after_command);
    }
    EXPECT_GE(before_stale, 5U);
    EXPECT_EQ(while_not_armed, 0U) << "the stream came back, pulses did not";
    EXPECT_GE(after_command, 2U);
    EXPECT_GE(audit.at("decisions").at("withheld").at("not armed").get<int>(), 5);
    EXPECT_TRUE(audit.at("rerun").at("reproduced")) << audit.at("rerun");
}

TEST(LostPackets, AreGapsOfTheirLengthAndTheReRunStillDecidesTheSame) {
    Rig rig;
    const auto recording = rig.recording(20.0);
    const auto session = rig.live(rig.settings({}));
    EXPECT_EQ(rig.feed(recording, {"--speed", "8", "--lose-every", "600"})->status(), 0);
    const auto folder = Rig::folder_of(*session);
    // 25000 frames are 5000 packets of 5; every 600th of them is left out: 8 packets of 5 frames.
    ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(folder) >= 25000; })) << Rig::frames_stored(folder);
    session->send(SIGINT);
    EXPECT_EQ(session->status(), 0) << session->err();
    const auto audit = rig.audit(folder);
    EXPECT_EQ(audit.at("stream").at("gaps").size(), 8U);
    EXPECT_EQ(audit.at("stream").at("frames_missing"), 40);
    for (const auto& gap : audit.at("stream").at("gaps")) {
        EXPECT_EQ(gap.at("frames"), 5);
        EXPECT_EQ(gap.at("cause"), "packet loss");
    }
    EXPECT_EQ(audit.at("stream").at("packets").at("lost"), 8);
    EXPECT_TRUE(audit.at("rerun").at("done"));
    EXPECT_TRUE(audit.at("rerun").at("reproduced")) << audit.at("rerun");
    EXPECT_GE(audit.at("decisions").at("pulses").get<int>(), 5);
}

} // namespace
} // namespace millpond::test
