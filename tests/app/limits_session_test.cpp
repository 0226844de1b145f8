// Limits, plan, speed gate and emergency stop in whole sessions: what the operator is told, and what the audit finds.
#include "app/rig.hpp"

namespace millpond::test {
namespace {

class LimitedSession : public ::testing::Test {
  protected:
    void begin(const std::string& more, bool armed = true) {
        RigSettings want;
        want.armed = armed;
        want.control = true;
        want.lockout_ms = 150.0;
        want.more = more;
        session_ = rig_.live(rig_.settings(want));
    }
    void feed(const std::vector<std::string>& more = {}, double seconds = 20.0) {
        std::vector<std::string> words{"--speed", "8"};
        words.insert(words.end(), more.begin(), more.end());
        sender_ = rig_.feed(rig_.recording(seconds), words);
    }
    void send(const std::string& message) {
        const auto sent = run("oscsend localhost " + std::to_string(rig_.control_port()) + " " + message);
        EXPECT_EQ(sent.status, 0) << sent.err;
    }
    void expect_told(const std::string& words) {
        EXPECT_TRUE(session_->says(words)) << words << "\n" << session_->err();
    }
    nlohmann::json end() {
        session_->send(SIGINT);
        EXPECT_EQ(session_->status(), 0) << session_->err();
        return audit();
    }
    nlohmann::json audit() {
        const auto found = rig_.audit(Rig::folder_of(*session_));
        EXPECT_TRUE(found.at("rerun").at("reproduced")) << found.at("rerun");
        return found;
    }
    static std::vector<std::string> states(const nlohmann::json& audit) {
        std::vector<std::string> words;
        for (const auto& state : audit.at("stream").at("states")) {
            words.push_back(state.at("after").get<std::string>() + ": " + state.at("cause").get<std::string>());
        }
        return words;
    }
    /// Streams, and expects the session to be faulted for `cause`, and nothing let through after.
    void expect_fault(const std::string& cause) {
        expect_told("millpond: faulted (" + cause + ")\n");
        EXPECT_EQ(sender_->status(), 0) << sender_->err();
        const auto found = end();
        EXPECT_EQ(states(found),
                  (std::vector<std::string>{"armed: start", "faulted: " + cause, "not armed: session end"}));
        const auto at = found.at("stream").at("states").at(1).at("sample").get<std::uint64_t>();
        EXPECT_EQ(found.at("stream").at("states").at(1).at("by"), "program");
        for (const auto& row : rows_of(Rig::folder_of(*session_) / "events.tsv", "trigger")) {
            EXPECT_LT(std::stoull(row.at("sample")), at);
        }
        EXPECT_GT(found.at("decisions").at("withheld").at("faulted").get<int>(), 0);
    }

    Rig rig_;
    std::unique_ptr<Process> session_, sender_;
};

TEST_F(LimitedSession, ARunawayFaultsIt) {
    begin("limits: {runaway: {expected_per_s: 0.05, window_s: 8, false_alarms_per_hour: 0.5}}\n");
    feed();
    expect_fault("runaway");
}

TEST_F(LimitedSession, TooManyGapsFaultIt) {
    begin("limits: {max_gaps_per_minute: 3}\n");
    feed({"--lose-every", "600"});
    expect_fault("too many gaps");
}

TEST_F(LimitedSession, AFloorOutOfItsRangeFaultsIt) {
    begin("limits: {floor: {most_uv: 0.001}}\n");
    feed();
    expect_fault("floor out of range");
}

// Checked against: liblo's oscsend (OSC 1.0).
TEST_F(LimitedSession, AnEmergencyStopStandsUntilItIsClearedAndThenArmed) {
    if (!has_program("oscsend")) {
        GTEST_SKIP() << "SKIPPED LOUDLY: no oscsend (Debian: liblo-tools)";
    }
    begin({});
    feed({"--loop"});
    ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(Rig::folder_of(*session_)) > 5000; }));
    send("/stop");
    expect_told("millpond: faulted (emergency stop)\n");
    send("/arm");
    expect_told("OSC /arm: found an emergency stop; allowed: /clear first, when all is safe\n");
    send("/clear");
    expect_told("millpond: not armed (command)\n");
    send("/arm");
    expect_told("millpond: armed (command)\n");
    session_->send(SIGUSR1);
    expect_told("emergency stop (SIGUSR1)");
    EXPECT_TRUE(wait_until([&] { return count_in(session_->err(), "millpond: faulted (emergency stop)\n") == 2; }));
    const auto found = end();
    EXPECT_EQ(states(found),
              (std::vector<std::string>{"armed: start", "faulted: emergency stop", "not armed: command",
                                        "armed: command", "faulted: emergency stop", "not armed: session end"}));
    const auto& list = found.at("stream").at("states");
    EXPECT_TRUE(list.at(1).at("by").get<std::string>().starts_with("command from 127.0.0.1:")) << list;
    EXPECT_EQ(list.at(4).at("by"), "signal");
}

TEST_F(LimitedSession, APlanIsShownFollowedAndEndsTheSession) {
    begin("plan:\n  ends_session: true\n  epochs:\n    - {name: rest, minutes: 0.1, pulses: false}\n"
          "    - {name: track, minutes: 0.15}\n");
    feed();
    expect_told("epoch: rest (no pulses)\n");
    expect_told("epoch: track\n");
    expect_told("the plan is over\n");
    EXPECT_EQ(session_->status(), 0) << session_->err();
    EXPECT_NE(session_->err().find(" | rest, no pulses, 0:0"), std::string::npos) << session_->err();
    const auto found = audit();
    const auto& epochs = found.at("epochs");
    ASSERT_EQ(epochs.size(), 3U);
    EXPECT_EQ(epochs.at(0).at("to_sample"), 6 * 1250);
    EXPECT_EQ(epochs.at(1).at("to_sample"), 15 * 1250);
    EXPECT_EQ(epochs.at(0).at("pulses"), 0);
    EXPECT_GT(epochs.at(0).at("withheld").at("gate").get<int>(), 0);
    EXPECT_GT(epochs.at(1).at("pulses").get<int>(), 3);
    EXPECT_EQ(epochs.at(2).at("name"), "after the plan");
    EXPECT_EQ(epochs.at(1).at("score").at("session").at("eligible_minutes").get<double>() > 0.0, true);
}

// Checked against: liblo's oscsend (OSC 1.0).
TEST_F(LimitedSession, TheSpeedGateFollowsTheCommandAndClosesWhenItGrowsStale) {
    if (!has_program("oscsend")) {
        GTEST_SKIP() << "SKIPPED LOUDLY: no oscsend (Debian: liblo-tools)";
    }
    begin("speed_gate: {on: true, hold_ms: 0, stale_after_ms: 700, delay_ms: 40}\n");
    expect_told("the speeds are 40 ms late");
    feed({"--loop"});
    const auto folder = Rig::folder_of(*session_);
    const auto moves = [&] {
        const SessionReader read(folder);
        return std::count_if(read.events().begin(), read.events().end(),
                             [](const Event& event) { return event.kind == EventKind::gate; });
    };
    const auto before = moves(); // two gates as they start
    send("/speed f 1.5");
    EXPECT_TRUE(wait_until([&] { return moves() >= before + 1; })) << session_->err();
    EXPECT_TRUE(wait_until([&] { return moves() >= before + 2; })) << "nothing more came: stale";
    send("/speed f -1");
    expect_told("OSC /speed: found a speed below 0; allowed: 0 or more, in the unit of speed_gate.unit\n");
    send("/epoch");
    expect_told("OSC /epoch: found a session without a plan; allowed: epochs in plan.epochs of the settings\n");
    const auto found = end();
    const auto& gates = found.at("stream").at("gates");
    ASSERT_EQ(gates.size(), 4U) << gates;
    EXPECT_EQ(gates.at(2).at("name"), "speed");
    EXPECT_EQ(gates.at(2).at("open"), true);
    EXPECT_EQ(gates.at(2).at("by"), "speed");
    EXPECT_EQ(gates.at(3).at("open"), false);
    EXPECT_EQ(found.at("stream").at("speed").at("values"), 1);
    EXPECT_EQ(found.at("provenance").at("more").at("speed_gate_delay_ms"), 40.0);
}

TEST_F(LimitedSession, AStimulusIsWarnedOfRecordedAndHoldsUpNothing) {
    begin("stimulus: {current_ua: 250, phase_us: 200, diameter_um: 60}\n");
    expect_told("stimulus: 0.05 uC a phase (biphasic), 1768 uC/cm2 on 2827 um2, Shannon k 1.95\n");
    expect_told("ask the licensed veterinarian\n");
    feed();
    EXPECT_EQ(sender_->status(), 0) << sender_->err();
    ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(Rig::folder_of(*session_)) >= 25000; }));
    const auto found = end();
    EXPECT_GT(found.at("decisions").at("pulses").get<int>(), 5);
    const auto& kept = found.at("provenance").at("more").at("stimulus");
    EXPECT_NEAR(kept.at("shannon_k").get<double>(), 1.947, 0.001);
    EXPECT_GE(kept.at("warnings").size(), 4U);
    const auto text = run_millpond("audit " + Rig::folder_of(*session_).string()).out;
    EXPECT_NE(text.find("Stimulus, as stated in the settings\n  0.05 uC a phase"), std::string::npos) << text;
}

/// Findings of preflight about one thing.
std::vector<std::string> findings(const std::string& settings, const std::string& about) {
    std::vector<std::string> found;
    for (const auto& line : lines_of(run_millpond("preflight " + settings).out)) {
        if (line.size() > 8 && line.substr(8).starts_with(about + " ")) {
            found.push_back(line);
        }
    }
    return found;
}

TEST(Preflight, SaysWhichLimitsCannotBeReachedAndWhichAreReachedSoon) {
    Rig rig;
    RigSettings want;
    want.lockout_ms = 500.0;
    want.more = "limits: {max_pulses_per_second: 4, max_pulses_per_minute: 200, max_pulses_per_session: 900,\n"
                "  max_pulses_per_epoch: 100, min_interval_ms: 300}\n"
                "plan: {epochs: [{name: track, minutes: 40}]}\n"
                "stimulus: {current_ua: 250, phase_us: 200, diameter_um: 60}\n";
    const auto settings = rig.settings(want);
    const auto limits = findings(settings, "limits");
    ASSERT_EQ(limits.size(), 1U);
    EXPECT_TRUE(limits[0].starts_with("caution")) << limits[0];
    EXPECT_NE(
        limits[0].find("at most 2 triggers a second, 120 a minute; 4 a second can never be reached: 500 ms from one "
                       "trigger to the next leave 2; 200 a minute can never be reached: the other limits leave "
                       "120; min_interval_ms 300 does nothing beside a lock-out of 500 ms"),
        std::string::npos)
        << limits[0];
    const auto session = findings(settings, "session limit");
    ASSERT_EQ(session.size(), 1U);
    EXPECT_NE(
        session[0].find("900 triggers are reached after 10 minutes at 1.5 a second, the most expected; the plan has "
                        "40 minutes with pulses"),
        std::string::npos)
        << session[0];
    ASSERT_EQ(findings(settings, "epoch limit").size(), 1U);
    const auto runaway = findings(settings, "runaway guard");
    ASSERT_EQ(runaway.size(), 1U);
    EXPECT_NE(runaway[0].find("never lets so many through; no interval is as short"), std::string::npos) << runaway[0];
    EXPECT_GE(findings(settings, "stimulus").size(), 4U);
    EXPECT_EQ(findings(settings, "plan").size(), 1U);
}

TEST(Preflight, ASpeedGateThatNobodyCanTellIsNotFit) {
    Rig rig;
    RigSettings want;
    want.more = "speed_gate: {on: true}\n";
    const auto found = findings(rig.settings(want), "speed gate");
    ASSERT_EQ(found.size(), 1U);
    EXPECT_TRUE(found[0].starts_with("BAD")) << found[0];
}

} // namespace
} // namespace millpond::test
