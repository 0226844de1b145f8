// Lines end low, whatever ends the session: real sessions of the built program, pulses on OSC and on a microcontroller
// at the end of a cable, which runs its own program.
#include "app/rig.hpp"
#include "support/board.hpp"
#include "support/pseudo_terminal.hpp"

#include <algorithm>

namespace millpond::test {
namespace {

std::string line_levels(const Process& dump) {
    std::string levels;
    for (const auto& line : lines_of(dump.out())) {
        if (const auto at = line.find("/line i "); at != std::string::npos) {
            levels += line.at(at + 8);
        }
    }
    return levels;
}

#define NEEDS_OSCDUMP()                                                                                                \
    if (!has_program("oscdump")) {                                                                                     \
        GTEST_SKIP() << "SKIPPED LOUDLY: no oscdump and oscsend (Debian: liblo-tools)";                                \
    }

/// Pulses of a whole second, far apart.
RigSettings long_pulses() {
    RigSettings want;
    want.output = "osc";
    want.width_ms = 1000.0;
    want.lockout_ms = 20000.0;
    return want;
}

/// Stops the session in the middle of a pulse by `end` and expects the line low soon after.
void expect_low_after(const RigSettings& want, const std::function<void(Process&)>& end) {
    Rig rig;
    const auto recording = rig.recording(12.0);
    const auto dump = rig.oscdump();
    const auto session = rig.live(rig.settings(want));
    const auto sender = rig.feed(recording, {"--speed", "4"});
    ASSERT_TRUE(dump->says("/line i 1")) << session->err();
    end(*session);
    EXPECT_TRUE(wait_until([&] { return line_levels(*dump).back() == '0'; })) << dump->out();
    std::this_thread::sleep_for(std::chrono::milliseconds{50});
    EXPECT_EQ(line_levels(*dump).back(), '0');
}

// Not the pulse's own end: the width is longer than any test waits.
TEST(KilledInAPulse, TheWatchdogLowersAnOscLine) {
    NEEDS_OSCDUMP();
    auto want = long_pulses();
    want.longest_high_ms = 9000.0;
    expect_low_after(want, [](Process& session) {
        session.send(SIGKILL);
        EXPECT_EQ(session.status(), 128 + SIGKILL);
        EXPECT_TRUE(
            wait_until([&] { return session.err().find("watchdog ordered every line low") != std::string::npos; }));
    });
}

// A program that stands still lowers nothing; its watchdog does.
TEST(StoppedInAPulse, TheWatchdogLowersAnOscLineAfterItsLongestHighTime) {
    NEEDS_OSCDUMP();
    auto want = long_pulses();
    want.longest_high_ms = 1100.0;
    Rig rig;
    const auto recording = rig.recording(12.0);
    const auto dump = rig.oscdump();
    const auto session = rig.live(rig.settings(want));
    const auto sender = rig.feed(recording, {"--speed", "4"});
    ASSERT_TRUE(dump->says("/line i 1")) << session->err();
    session->send(SIGSTOP);
    EXPECT_TRUE(wait_until([&] { return line_levels(*dump).back() == '0'; })) << dump->out();
    session->send(SIGCONT);
    EXPECT_TRUE(session->says("millpond: faulted (line held)\n")) << session->err();
    session->send(SIGINT);
    EXPECT_EQ(session->status(), 0) << session->err();
}

pid_t watchdog_of(const std::filesystem::path& session) {
    // By its name, which it gives itself, and by the folder that its parent has open.
    for (const auto& entry : std::filesystem::directory_iterator("/proc")) {
        const auto name = entry.path() / "comm";
        std::error_code gone;
        if (!std::filesystem::exists(name, gone)) {
            continue;
        }
        try {
            if (text_of(name) != "millpond-watch\n") {
                continue;
            }
            const auto status = text_of(entry.path() / "status");
            const auto parent = std::stoi(status.substr(status.find("PPid:") + 5));
            for (const auto& file : std::filesystem::directory_iterator("/proc/" + std::to_string(parent) + "/fd")) {
                if (std::filesystem::read_symlink(file, gone).string().starts_with(session.string())) {
                    return std::stoi(entry.path().filename().string());
                }
            }
        } catch (const std::exception&) {
            continue; // it ended meanwhile
        }
    }
    return -1;
}

TEST(LostWatchdog, FaultsTheSessionAndAnotherTakesOver) {
    Rig rig;
    const auto session = rig.live(rig.settings({}));
    const auto folder = Rig::folder_of(*session);
    const auto sender = rig.feed(rig.recording(20.0), {"--loop", "--speed", "4"});
    ASSERT_TRUE(session->says("millpond: armed (start)\n")) << session->err();
    const auto first = watchdog_of(folder);
    ASSERT_GT(first, 1);
    ::kill(first, SIGKILL);
    EXPECT_TRUE(session->says("millpond: the watchdog of the lines was lost\n")) << session->err();
    EXPECT_TRUE(session->says("millpond: faulted (watchdog lost)\n")) << session->err();
    EXPECT_TRUE(session->says("another watchdog has taken over")) << session->err();
    const auto second = watchdog_of(folder);
    EXPECT_GT(second, 1);
    EXPECT_NE(second, first);
    session->send(SIGTERM);
    EXPECT_EQ(session->status(), 0) << session->err();
    EXPECT_TRUE(wait_until([&] { return ::kill(second, 0) != 0; })) << "it goes home with the session";
}

/// A session whose pulse line is a microcontroller, and whose marker is another OSC line.
struct BoardRig {
    Rig rig;
    PseudoTerminal cable{rig / "board"};
    std::unique_ptr<Board> board = std::make_unique<Board>(cable.end());

    std::string settings(double width_ms) {
        RigSettings want;
        want.lockout_ms = 300.0;
        want.control = true;
        want.more_outputs =
            "  - {name: board, kind: serial_bytes, device: " + cable.name() +
            ", width_ms: " + std::to_string(width_ms) + ", longest_high_ms: 5000}\n" +
            "  - {name: marker, kind: osc, follows: trigger, port: " + std::to_string(rig.pulse_port()) +
            ", width_ms: 2, longest_high_ms: 5000}\n";
        return rig.settings(want);
    }
    static std::size_t rises() {
        const auto levels = Board::levels();
        return static_cast<std::size_t>(std::count(levels.begin(), levels.end(), '1'));
    }
};

TEST(SeveralOutputs, EachGetsEveryPulseAndTheMarkerEveryTrigger) {
    NEEDS_OSCDUMP();
    BoardRig rig;
    const auto recording = rig.rig.recording(20.0);
    const auto dump = rig.rig.oscdump();
    const auto session = rig.rig.live(rig.settings(5.0));
    EXPECT_EQ(rig.rig.feed(recording, {"--speed", "4"})->status(), 0);
    const auto folder = Rig::folder_of(*session);
    ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(folder) >= 25000; }));
    session->send(SIGINT);
    EXPECT_EQ(session->status(), 0) << session->err();
    const auto audit = rig.rig.audit(folder);
    const auto pulses = audit.at("decisions").at("pulses").get<std::size_t>();
    EXPECT_GE(pulses, 5U);
    EXPECT_EQ(BoardRig::rises(), pulses);
    EXPECT_EQ(Board::levels().back(), '0');
    EXPECT_TRUE(wait_until([&] {
        const auto levels = line_levels(*dump);
        return static_cast<std::size_t>(std::count(levels.begin(), levels.end(), '1')) == pulses;
    })) << dump->out();
    EXPECT_TRUE(audit.at("rerun").at("reproduced")) << audit.at("rerun");
    const auto& outputs = audit.at("outputs");
    ASSERT_EQ(outputs.size(), 3U);
    EXPECT_EQ(outputs[1].at("name"), "board");
    EXPECT_EQ(outputs[1].at("ends"), pulses);
    EXPECT_GE(outputs[1].at("width").at("p50_ns"), 5'000'000);
    EXPECT_TRUE(outputs[2].at("marker"));
    EXPECT_EQ(outputs[2].at("ends"), pulses);
    EXPECT_GE(outputs[2].at("width").at("p50_ns"), 2'000'000);
}

TEST(UnpluggedCable, FaultsTheSessionWhichTriesTheDeviceAgainAndArmsByCommandOnly) {
    NEEDS_OSCDUMP();
    BoardRig rig;
    const auto dump = rig.rig.oscdump(); // a marker that nobody hears would be a failure of its own
    const auto session = rig.rig.live(rig.settings(5.0));
    const auto folder = Rig::folder_of(*session);
    const auto sender = rig.rig.feed(rig.rig.recording(20.0), {"--loop", "--speed", "4"});
    ASSERT_TRUE(wait_until([] { return BoardRig::rises() >= 2; })) << session->err();
    rig.board.reset();
    rig.cable.unplug();
    EXPECT_TRUE(session->says("millpond: output board is lost; it is tried every second\n")) << session->err();
    EXPECT_TRUE(session->says("millpond: faulted (output failed)\n")) << session->err();

    rig.cable.plug_in();
    rig.board = std::make_unique<Board>(rig.cable.end());
    EXPECT_TRUE(session->says("millpond: output board is back, its line ordered low")) << session->err();
    EXPECT_EQ(BoardRig::rises(), 0U) << "nobody has armed yet";
    run("oscsend localhost " + std::to_string(rig.rig.control_port()) + " /arm");
    EXPECT_TRUE(wait_until([] { return BoardRig::rises() >= 2; })) << session->err();

    // The watchdog that has taken over knows the new device.
    session->send(SIGKILL);
    EXPECT_EQ(session->status(), 128 + SIGKILL);
    EXPECT_TRUE(wait_until([] { return Board::levels().back() == '0'; }));
    const auto table = run_millpond("audit " + folder.string() + " --json");
    const auto audit = nlohmann::json::parse(table.out);
    EXPECT_EQ(audit.at("outputs")[1].at("lost"), 1);
}

TEST(StoppedStream, EndsWithTheLineLow) {
    NEEDS_OSCDUMP();
    Rig rig;
    auto want = long_pulses();
    want.stale_after_ms = 300.0;
    const auto recording = rig.recording(30.0);
    const auto dump = rig.oscdump();
    const auto session = rig.live(rig.settings(want));
    const auto sender = rig.feed(recording, {"--speed", "2"});
    ASSERT_TRUE(dump->says("/line i 1")) << session->err();
    sender->send(SIGKILL);
    EXPECT_TRUE(session->says("millpond: not armed (stale stream)\n")) << session->err();
    EXPECT_TRUE(wait_until([&] { return line_levels(*dump).back() == '0'; })) << dump->out();
}

TEST(Preflight, ChecksEachOutputAndTheWatchdog) {
    BoardRig rig;
    const auto ran = run_millpond("preflight " + rig.settings(5.0));
    EXPECT_NE(ran.out.find("good    output board      serial_bytes on " + rig.cable.name() + ": answered"),
              std::string::npos)
        << ran.out;
    EXPECT_NE(ran.out.find("good    output marker"), std::string::npos) << ran.out;
    EXPECT_NE(ran.out.find("watchdog          a process of its own lowers pulse after 5000 ms high"), std::string::npos)
        << ran.out;
    EXPECT_EQ(BoardRig::rises(), 0U) << "no pulse is ordered";
    rig.board.reset();
    rig.cable.unplug();
    const auto without = run_millpond("preflight " + (rig.rig / "rig.yaml").string());
    EXPECT_EQ(without.status, 1);
    EXPECT_NE(without.out.find("BAD     outputs"), std::string::npos) << without.out;
    EXPECT_NE(without.out.find("outputs.board.device"), std::string::npos) << without.out;
}

} // namespace
} // namespace millpond::test
