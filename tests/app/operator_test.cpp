// What an operator does to a running session: commands by liblo's oscsend, and signals.
#include "app/rig.hpp"

namespace millpond::test {
namespace {

#define NEEDS_LIBLO()                                                                                                  \
    if (!has_program("oscsend") || !has_program("oscdump")) {                                                          \
        GTEST_SKIP() << "SKIPPED LOUDLY: no oscsend or oscdump (Debian: liblo-tools), nothing was checked against it"; \
    }                                                                                                                  \
    static_cast<void>(0)

// Checked against: liblo's oscsend (OSC 1.0).
class Commands : public ::testing::Test {
  protected:
    void SetUp() override { NEEDS_LIBLO(); }

    void begin(const std::string& secret = {}) {
        RigSettings want;
        want.armed = false;
        want.control = true;
        want.secret = secret;
        session_ = rig_.live(rig_.settings(want));
    }
    void send(const std::string& message) {
        const auto sent = run("oscsend localhost " + std::to_string(rig_.control_port()) + " " + message);
        EXPECT_EQ(sent.status, 0) << sent.err;
    }
    /// Sends, and waits until the operator is told `words` for the `times`-th time.
    void send_and_read(const std::string& message, const std::string& words, std::size_t times = 1) {
        send(message);
        EXPECT_TRUE(wait_until([&] { return count_in(session_->err(), words) >= times; })) << message << "\n"
                                                                                           << session_->err();
        EXPECT_EQ(count_in(session_->err(), words), times) << message << "\n" << session_->err();
    }
    nlohmann::json end() {
        session_->send(SIGINT);
        EXPECT_EQ(session_->status(), 0) << session_->err();
        return rig_.audit(Rig::folder_of(*session_));
    }
    /// Marks are read last, so whatever was sent before one has been obeyed when it stands in the records.
    void mark_and_wait(const std::string& message, const std::string& text) {
        send(message);
        EXPECT_TRUE(wait_until([&] {
            for (const auto& note : notes_in(SessionReader(Rig::folder_of(*session_)).events())) {
                if (note.text == text) {
                    return true;
                }
            }
            return false;
        })) << session_->err();
    }
    static std::vector<std::string> states(const nlohmann::json& audit) {
        std::vector<std::string> states;
        for (const auto& state : audit.at("stream").at("states")) {
            states.push_back(state.at("after").get<std::string>() + " by " + state.at("cause").get<std::string>());
        }
        return states;
    }

    Rig rig_;
    std::unique_ptr<Process> session_;
};

TEST_F(Commands, ArmDisarmMarkAndGateAreObeyedInTheirOrderAndJournaled) {
    begin();
    send_and_read("/arm", "millpond: armed (command)\n");
    send_and_read("/disarm", "millpond: not armed (command)\n");
    send_and_read("/arm i 1", "millpond: armed (command)\n", 2);
    send("/gate si immobile 0");
    mark_and_wait("/mark s 'rat lies down, a text that is longer than one record of the journal takes'",
                  "rat lies down, a text that is longer than one record of the journal takes");
    send("/gate si immobile 1");
    mark_and_wait("/mark s 'last'", "last");
    const auto audit = end();
    const auto state_list = states(audit);
    ASSERT_GE(state_list.size(), 4U) << audit.at("stream");
    const std::vector<std::string> commanded(state_list.end() - 4, state_list.end());
    EXPECT_EQ(commanded, (std::vector<std::string>{"armed by command", "not armed by command", "armed by command",
                                                   "not armed by session end"}));
    const auto& gates = audit.at("stream").at("gates");
    ASSERT_GE(gates.size(), 2U) << audit.at("stream");
    EXPECT_EQ(gates.at(gates.size() - 2).at("open"), false);
    EXPECT_EQ(gates.back().at("open"), true);
    EXPECT_EQ(audit.at("stream").at("notes").size(), 2U);
}

TEST_F(Commands, WhatIsNoCommandIsRefusedInOneLineEachAndChangesNothing) {
    begin();
    send_and_read("/arms",
                  "OSC /arms: found an unknown address; allowed: /arm, /disarm, /stop, /clear, /mark, /gate, /epoch, "
                  "/speed, /trial\n");
    send_and_read("/arm i 2", "OSC /arm: found other arguments; allowed: none, or 1\n");
    send_and_read("/gate si immobil 0", "OSC /gate: found no gate 'immobil'; allowed: did you mean 'immobile'?\n");
    send_and_read("/gate s immobile",
                  "OSC /gate: found other arguments; allowed: a gate's name and 1 (open) or 0 (closed)\n");
    send_and_read("/mark i 7", "OSC /mark: found other arguments; allowed: one text\n");
    const auto refused = count_in(session_->err(), "allowed:");
    EXPECT_EQ(refused, 5U) << session_->err();
    EXPECT_EQ(count_in(text_of(Rig::folder_of(*session_) / "log.txt"), "allowed:"), 5U)
        << "the session folder keeps them";
    const auto audit = end();
    EXPECT_EQ(audit.at("stream").at("notes").size(), 0U);
    for (const auto& state : states(audit)) {
        EXPECT_EQ(state.find("armed by command"), std::string::npos) << state;
    }
}

TEST_F(Commands, WithASecretOnlyItsOwnerIsObeyedAndItIsKeptNowhere) {
    begin("drowssap-7");
    const std::string line = "found no secret or a wrong one; allowed: the secret of the settings as first argument\n";
    send_and_read("/arm", line);
    send_and_read("/arm s drowssap-8", line, 2);
    send_and_read("/arm s drowssap-7", "millpond: armed (command)\n");
    send_and_read("/disarm s drowssap-7", "millpond: not armed (command)\n");
    mark_and_wait("/mark ss drowssap-7 cage", "cage");
    const auto folder = Rig::folder_of(*session_);
    end();
    for (const auto& file : std::filesystem::directory_iterator(folder)) {
        EXPECT_EQ(text_of(file).find("drowssap"), std::string::npos) << file.path();
    }
    EXPECT_EQ(session_->err().find("drowssap"), std::string::npos);
}

class Signals : public ::testing::TestWithParam<int> {};

// Checked against: liblo's oscdump, whose last line is what the line was last told.
TEST_P(Signals, InTheMiddleOfALongPulseTheLineFallsAndTheFolderIsComplete) {
    NEEDS_LIBLO();
    Rig rig;
    RigSettings want;
    want.output = "osc";
    want.width_ms = 1000.0;
    want.lockout_ms = 20000.0;
    const auto recording = rig.recording(12.0);
    const auto dump = rig.oscdump();
    const auto session = rig.live(rig.settings(want));
    const auto sender = rig.feed(recording, {"--speed", "4"});
    ASSERT_TRUE(dump->says("/line i 1")) << session->err();
    session->send(GetParam());
    EXPECT_EQ(session->status(), 0) << session->err();
    // The order to fall was sent before the session ended; oscdump may print it a moment later.
    const auto last_level = [&] {
        const auto lines = lines_of(dump->out());
        return lines.empty() ? std::string{} : lines.back().substr(lines.back().find("/line"));
    };
    EXPECT_TRUE(wait_until([&] { return last_level() == "/line i 0"; })) << dump->out();
    EXPECT_EQ(count_in(dump->out(), "/line i 1"), 1U) << dump->out();

    const auto folder = Rig::folder_of(*session);
    for (const char* name :
         {"settings.yaml", "provenance.json", "records.mpj", "events.tsv", "events.json", "log.txt"}) {
        EXPECT_TRUE(std::filesystem::exists(folder / name)) << name;
    }
    const auto audit = rig.audit(folder);
    EXPECT_FALSE(audit.at("cut"));
    EXPECT_EQ(audit.at("decisions").at("pulses"), 1);
    EXPECT_EQ(audit.at("decisions").at("pulse_ends"), 1);
    const auto pulses = rows_of(folder / "events.tsv", "pulse");
    ASSERT_EQ(pulses.size(), 1U);
    EXPECT_LT(std::stod(pulses[0].at("duration")), 1.0) << "cut short, and the table says how short";
}

INSTANTIATE_TEST_SUITE_P(Interrupted, Signals, ::testing::Values(SIGINT, SIGTERM, SIGHUP));

} // namespace
} // namespace millpond::test
