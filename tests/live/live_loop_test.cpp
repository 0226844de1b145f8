#include "base/clock.hpp"
#include "live/live_loop.hpp"
#include "support/allocation_guard.hpp"
#include "support/signals.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <functional>
#include <thread>

namespace millpond {
namespace {

constexpr Hertz rate{1250.0};
using namespace std::chrono_literals;

/// Delivers a recording packet by packet as fast as it is asked, and does what the test says before each.
struct ScriptedSource : SampleSource {
    std::vector<float> data;
    std::size_t channel_count, packet_frames = 10, at = 0;
    PacketCounts packet_counts{};
    std::function<Received(std::size_t frame)> before = [](std::size_t) { return Received::frames; };

    ScriptedSource(std::vector<float> samples, std::size_t channels)
        : data(std::move(samples)), channel_count(channels) {}

    Received receive(Nanos /*timeout*/, Arrival& arrival) noexcept override {
        if (at * channel_count >= data.size()) {
            return Received::ended;
        }
        if (const auto told = before(at); told != Received::frames) {
            return told;
        }
        const std::size_t frames = std::min(packet_frames, data.size() / channel_count - at);
        arrival.block = {SampleIndex{at}, channel_count, {data.data() + at * channel_count, frames * channel_count}};
        at += frames;
        ++packet_counts[static_cast<std::size_t>(PacketCause::accepted)];
        return Received::frames;
    }
    [[nodiscard]] const PacketCounts& counts() const noexcept override { return packet_counts; }
    [[nodiscard]] Hertz rate() const noexcept override { return millpond::rate; }
    [[nodiscard]] std::size_t channels() const noexcept override { return channel_count; }
};

struct KeptJournal : LoopJournal {
    std::vector<Event> events;
    std::size_t stored_frames = 0, timed = 0;
    bool broken = false;
    KeptJournal() { events.reserve(100000); }
    std::function<void(const Event&)> on_take = [](const Event&) {};
    void take(const Event& event) noexcept override {
        events.push_back(event);
        on_take(event);
    }
    void store(const FrameBlock& block) noexcept override { stored_frames += block.frames(); }
    void time_packet(std::int64_t, std::int64_t, std::int64_t) noexcept override { ++timed; }
    [[nodiscard]] bool failed() const noexcept override { return broken; }
    [[nodiscard]] std::vector<Event> of(EventKind kind) const {
        std::vector<Event> found;
        std::copy_if(events.begin(), events.end(), std::back_inserter(found),
                     [kind](const auto& event) { return event.kind == kind; });
        return found;
    }
};

struct NoEnds : EventSink {
    void take(const Event& /*event*/) noexcept override {}
};

struct FailingOutput : Output {
    std::atomic<bool> works{true}, high{false};
    std::atomic<int> rises{0};
    bool set_line(bool to) noexcept override {
        rises += to ? 1 : 0;
        high = to && works;
        return works;
    }
};

/// A whole loop without a device: settle 2 s, a burst a second from 5 s on.
struct Rig {
    ScriptedSource source{bursts(), 2};
    FailingOutput output, marker;
    NoEnds ends;
    LineBoard board;
    PulseLines lines{std::vector<PulseLinePlan>{{&output, {1ms, 1, 10ms}, Follows::pulse},
                                                {&marker, {1ms, 1, 10ms}, Follows::trigger}},
                     board, ends};
    KeptJournal journal;
    SpscRing<Command> commands{64};
    LiveLoop loop;

    explicit Rig(LiveLoopSettings settings, ArbiterSettings arbiter = {})
        : loop(settings, source, lines, journal, commands, make_engine(std::move(arbiter))) {}

    static std::function<Engine(EventSink&, PulsePort&)> make_engine(ArbiterSettings arbiter = {}) {
        return [arbiter = std::move(arbiter)](EventSink& sink, PulsePort& port) {
            DetectorSettings detector;
            detector.method = DetectionMethod::envelope;
            detector.floor.settle_s = 2.0;
            detector.threshold.deviations = 6.0;
            return Engine(Detector::make(detector, ripple_channels(2), rate), arbiter, {}, rate, sink, port);
        };
    }

    static std::vector<float> bursts() {
        auto data = test::white_noise(20 * 1250, 2, 20.0, 7);
        for (std::size_t second = 5; second < 20; ++second) {
            test::add_burst(data, 2, second * 1250, 100, rate.value, 200.0, 250.0);
        }
        return data;
    }
};

LiveLoopSettings armed() {
    LiveLoopSettings settings;
    settings.start_armed = true;
    return settings;
}

TEST(LiveLoop, PulsesOnceForEachBurstAndStoresEveryFrame) {
    Rig rig(armed());
    rig.loop.run();
    EXPECT_EQ(rig.loop.end(), LoopEnd::ended);
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 15U);
    EXPECT_EQ(rig.journal.of(EventKind::trigger).size(), 15U);
    EXPECT_EQ(rig.journal.stored_frames, 20U * 1250U);
    EXPECT_EQ(rig.journal.timed, 2500U);
    for (const auto& pulse : rig.journal.of(EventKind::pulse)) {
        const auto detail = pulse.as<PulseDetail>();
        EXPECT_EQ(detail.transport_ns, PulseDetail::not_measured) << "nobody stamped the packet";
        EXPECT_GE(detail.packing_ns, 0);
        EXPECT_LE(detail.packing_ns, 9 * 800'000); // ten frames of 0.8 ms a packet
        EXPECT_GE(detail.compute_ns, 0);
    }
}

TEST(LiveLoop, MarkerLinesRiseAtEveryTriggerPulseLinesAtEveryPulse) {
    Rig rig(armed());
    rig.loop.run();
    EXPECT_EQ(rig.output.rises, 15);
    EXPECT_EQ(rig.marker.rises, 15);
    EXPECT_FALSE(rig.output.high);
    EXPECT_FALSE(rig.marker.high);
}

/// Runs with trouble made by `make` from the eighth second on and armed again in the twelfth; gives the state's causes
/// and the seconds in which there were pulses.
std::pair<std::vector<std::string>, std::vector<std::uint64_t>> with_trouble(const std::function<void(Rig&)>& make) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        if (frame == 8 * 1250) {
            make(rig);
        } else if (frame == 12 * 1250) {
            rig.commands.push(Command::make(CommandKind::arm));
        }
        return Received::frames;
    };
    rig.loop.run();
    std::pair<std::vector<std::string>, std::vector<std::uint64_t>> found;
    for (const auto& state : rig.journal.of(EventKind::state)) {
        found.first.emplace_back(name_of(static_cast<StateCause>(state.as<StateDetail>().cause)));
    }
    for (const auto& pulse : rig.journal.of(EventKind::pulse)) {
        found.second.push_back(pulse.sample.value / 1250);
    }
    return found;
}

TEST(LiveLoop, ALineThatTheWatchdogLoweredFaultsUntilSomebodyArms) {
    const auto [causes, pulses] = with_trouble([](Rig& rig) { rig.board.lowered(0, 1); });
    EXPECT_EQ(causes, (std::vector<std::string>{"start", "line held", "command", "session end"}));
    EXPECT_EQ(pulses, (std::vector<std::uint64_t>{5, 6, 7, 12, 13, 14, 15, 16, 17, 18, 19}));
}

TEST(LiveLoop, ALostWatchdogFaultsAndArmingWithoutAnotherFaultsAgain) {
    const auto [causes, pulses] = with_trouble([](Rig& rig) { rig.lines.set_watched(false); });
    EXPECT_EQ(causes, (std::vector<std::string>{"start", "watchdog lost", "command", "watchdog lost", "session end"}));
    EXPECT_EQ(pulses, (std::vector<std::uint64_t>{5, 6, 7}));
}

TEST(LiveLoop, ALostDeviceFaultsBeforeAnyPulseIsOrdered) {
    const auto [causes, pulses] = with_trouble([](Rig& rig) { rig.lines.set_lost(1, true); });
    EXPECT_EQ(causes, (std::vector<std::string>{"start", "output failed", "command", "output failed", "session end"}));
    EXPECT_EQ(pulses, (std::vector<std::uint64_t>{5, 6, 7}));
}

TEST(LiveLoop, StartsNotArmedUnlessToldAndArmsByCommand) {
    Rig rig({});
    rig.source.before = [&](std::size_t frame) {
        if (frame == 10 * 1250) {
            rig.commands.push(Command::make(CommandKind::arm));
        } else if (frame == 15 * 1250) {
            rig.commands.push(Command::make(CommandKind::disarm));
        }
        return Received::frames;
    };
    rig.loop.run();
    for (const auto& pulse : rig.journal.of(EventKind::pulse)) {
        EXPECT_GE(pulse.sample.value, 10U * 1250U);
        EXPECT_LT(pulse.sample.value, 15U * 1250U);
    }
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 5U);
}

TEST(LiveLoop, StaleStreamDisarmsAndStaysSo) {
    auto settings = armed();
    settings.stale_after = 1ms;
    Rig rig(settings);
    bool paused = false;
    rig.source.before = [&](std::size_t frame) {
        if (frame == 8 * 1250 && !paused) {
            paused = true;
            std::this_thread::sleep_for(5ms);
            return Received::nothing;
        }
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 3U);
    const auto states = rig.journal.of(EventKind::state);
    ASSERT_EQ(states.size(), 3U); // start, stale, end
    EXPECT_EQ(states[1].as<StateDetail>().cause, static_cast<std::uint8_t>(StateCause::stale_stream));
    EXPECT_EQ(states[1].code, static_cast<std::uint8_t>(ArmState::not_armed));
}

TEST(LiveLoop, FailingOutputFaultsAndOnlyANewArmingEndsIt) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        rig.output.works = frame < 7 * 1250 || frame >= 9 * 1250;
        if (frame == 12 * 1250) {
            rig.commands.push(Command::make(CommandKind::arm));
        }
        return Received::frames;
    };
    rig.loop.run();
    std::vector<std::uint64_t> seconds;
    for (const auto& pulse : rig.journal.of(EventKind::pulse)) {
        seconds.push_back(pulse.sample.value / 1250);
    }
    EXPECT_EQ(seconds, (std::vector<std::uint64_t>{5, 6, 7, 12, 13, 14, 15, 16, 17, 18, 19}));
}

TEST(LiveLoop, FailingJournalFaultsAndTheLoopKeepsWatching) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        rig.journal.broken = frame >= 8 * 1250;
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 3U);
    EXPECT_GE(rig.journal.of(EventKind::detection).size(), 15U);
}

TEST(LiveLoop, GatesAndMarksAreJournaledWhereTheyTookEffect) {
    ArbiterSettings arbiter;
    arbiter.gates = {{"immobile", true}};
    Rig rig(armed(), arbiter);
    rig.source.before = [&](std::size_t frame) {
        if (frame == 10 * 1250) {
            rig.commands.push(Command::make(CommandKind::close_gate, "immobile"));
            rig.commands.push(Command::make(CommandKind::mark, "door opened"));
        }
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 5U);
    const auto gates = rig.journal.of(EventKind::gate);
    ASSERT_EQ(gates.size(), 2U);
    EXPECT_EQ(gates[1].sample, SampleIndex{10 * 1250});
    const auto notes = rig.journal.of(EventKind::note);
    ASSERT_EQ(notes.size(), 1U);
    const auto note = notes[0].as<NoteDetail>();
    EXPECT_EQ(std::string(note.text.data(), note.length), "door opened");
}

TEST(LiveLoop, StopEndsItDisarmed) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        if (frame == 6 * 1250) {
            rig.loop.stop();
        }
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.loop.end(), LoopEnd::stopped);
    EXPECT_EQ(rig.loop.engine().arbiter().state(), ArmState::not_armed);
}

Command speed_of(double speed) {
    auto command = Command::make(CommandKind::speed);
    command.number = speed;
    command.came = monotonic_now();
    return command;
}

/// Remembers what it was last told.
struct LevelOutput : Output {
    std::atomic<bool> high{false};
    std::atomic<int> rises{0};
    bool set_line(bool level) noexcept override {
        high = level;
        rises += level ? 1 : 0;
        return true;
    }
};

TEST(EmergencyStop, LowersTheLineFromTheCallingThreadAtOnce) {
    Rig rig(armed());
    LevelOutput output;
    LineBoard board;
    PulseLines lines(std::vector<PulseLinePlan>{{&output, {10s, 1, 20s}, Follows::pulse}}, board, rig.ends);
    LiveLoop loop(armed(), rig.source, lines, rig.journal, rig.commands, rig.make_engine());
    lines.rise(Follows::pulse, SampleIndex{0});
    ASSERT_TRUE(output.high);
    loop.emergency_stop({ChangeSource::command}); // the loop does not even run
    EXPECT_FALSE(output.high);
    EXPECT_TRUE(loop.emergency_stopped());
}

TEST(EmergencyStop, FaultsAndNeitherArmingNorDisarmingEndsItBeforeItIsCleared) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        const auto at = [frame](std::size_t second) { return frame == second * 1250; };
        if (at(8)) {
            rig.loop.emergency_stop({ChangeSource::command, 4711, 0x7F000001});
        } else if (at(10) || at(15)) {
            rig.commands.push(Command::make(CommandKind::arm));
        } else if (at(11)) {
            rig.commands.push(Command::make(CommandKind::disarm));
        } else if (at(13)) {
            rig.loop.clear_emergency_stop();
            rig.commands.push(Command::make(CommandKind::clear));
        }
        return Received::frames;
    };
    rig.loop.run();
    std::vector<std::uint64_t> seconds;
    for (const auto& pulse : rig.journal.of(EventKind::pulse)) {
        seconds.push_back(pulse.sample.value / 1250);
    }
    EXPECT_EQ(seconds, (std::vector<std::uint64_t>{5, 6, 7, 15, 16, 17, 18, 19}));
    const auto states = rig.journal.of(EventKind::state);
    ASSERT_EQ(states.size(), 5U); // start, stop, clear, arm, end
    EXPECT_EQ(states[1].code, static_cast<std::uint8_t>(ArmState::faulted));
    EXPECT_EQ(states[1].as<StateDetail>().cause, static_cast<std::uint8_t>(StateCause::emergency_stop));
    EXPECT_EQ(by_of(states[1].as<StateDetail>()).port, 4711) << "who stopped it is kept";
    EXPECT_EQ(states[2].code, static_cast<std::uint8_t>(ArmState::not_armed));
    EXPECT_EQ(states[2].sample, SampleIndex{13 * 1250});
}

TEST(EmergencyStop, AStopAfterAClearStandsEvenWhereTheLoopSeesBothAtOnce) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        if (frame == 6 * 1250) {
            rig.loop.emergency_stop({ChangeSource::signal});
            rig.loop.clear_emergency_stop();
            rig.commands.push(Command::make(CommandKind::clear));
            rig.commands.push(Command::make(CommandKind::arm));
            rig.loop.emergency_stop({ChangeSource::signal});
        }
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 1U);
    EXPECT_EQ(rig.journal.of(EventKind::state)[1].code, static_cast<std::uint8_t>(ArmState::faulted));
    EXPECT_TRUE(rig.loop.emergency_stopped());
}

TEST(EmergencyStop, AStopThatIsClearedBeforeTheLoopLooksIsJournaledAndDisarmsAllTheSame) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        if (frame == 6 * 1250) {
            rig.loop.emergency_stop({ChangeSource::signal});
            rig.loop.clear_emergency_stop();
            rig.commands.push(Command::make(CommandKind::clear));
        }
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 1U);
    const auto states = rig.journal.of(EventKind::state);
    ASSERT_EQ(states.size(), 4U);
    EXPECT_EQ(states[1].as<StateDetail>().cause, static_cast<std::uint8_t>(StateCause::emergency_stop));
    EXPECT_EQ(states[2].code, static_cast<std::uint8_t>(ArmState::not_armed));
}

TEST(EmergencyStop, BetweenItAndItsPlaceInTheJournalNoLineIsRaised) {
    Rig rig(armed());
    LevelOutput output;
    LineBoard board;
    PulseLines lines(std::vector<PulseLinePlan>{{&output, {1ms, 1, 10ms}, Follows::pulse}}, board, rig.ends);
    rig.source.packet_frames = 5 * 1250; // the whole of what follows is one packet
    LiveLoop loop(armed(), rig.source, lines, rig.journal, rig.commands, rig.make_engine());
    rig.journal.on_take = [&](const Event& event) {
        if (event.kind == EventKind::trigger && rig.journal.of(EventKind::trigger).size() == 2) {
            loop.emergency_stop({ChangeSource::command});
        }
    };
    loop.run();
    EXPECT_EQ(output.rises, 2);
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 2U);
    EXPECT_GT(rig.journal.of(EventKind::trigger).size(), 2U) << "decided within the packet, and not given";
}

LiveLoopSettings with_speed_gate() {
    auto settings = armed();
    settings.speed_gate.on = true;
    settings.speed_gate.hold_ms = 0.0;
    settings.speed_gate.stale_after_ms = 600'000.0;
    return settings;
}

ArbiterSettings speed_gated() {
    ArbiterSettings arbiter;
    arbiter.speed_gate.on = true;
    return arbiter;
}

TEST(SpeedGateInTheLoop, IsClosedUntilASpeedComesAndFollowsIt) {
    Rig rig(with_speed_gate(), speed_gated());
    rig.source.before = [&](std::size_t frame) {
        if (frame == 8 * 1250) {
            rig.commands.push(speed_of(1.0));
        } else if (frame == 12 * 1250) {
            rig.commands.push(speed_of(20.0));
        }
        return Received::frames;
    };
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 4U);
    const auto gates = rig.journal.of(EventKind::gate);
    ASSERT_EQ(gates.size(), 3U); // as it starts, open, closed
    EXPECT_STREQ(gates[1].as<GateDetail>().name.data(), "speed");
    EXPECT_EQ(gates[1].sample, SampleIndex{8 * 1250});
    EXPECT_EQ(gates[2].sample, SampleIndex{12 * 1250});
    EXPECT_EQ(by_of(gates[0].as<GateDetail>()).source, ChangeSource::settings);
    EXPECT_EQ(by_of(gates[2].as<GateDetail>()).source, ChangeSource::speed);
    const auto speeds = rig.journal.of(EventKind::speed);
    ASSERT_EQ(speeds.size(), 2U);
    EXPECT_EQ(speeds[1].as<SpeedDetail>().value, 20.0);
    EXPECT_EQ(speeds[1].as<SpeedDetail>().values, 1U);
}

TEST(SpeedGateInTheLoop, AStaleSpeedClosesIt) {
    auto settings = with_speed_gate();
    settings.speed_gate.stale_after_ms = 50.0;
    Rig rig(settings, speed_gated());
    rig.source.before = [&](std::size_t frame) {
        if (frame % 1250 == 0 && frame <= 8 * 1250) {
            rig.commands.push(speed_of(0.0));
        } else if (frame == 10 * 1250) {
            std::this_thread::sleep_for(60ms); // the camera has stopped
        }
        return Received::frames;
    };
    rig.loop.run();
    const auto gates = rig.journal.of(EventKind::gate);
    ASSERT_GE(gates.size(), 3U);
    EXPECT_EQ(gates.back().as<GateDetail>().open, 0);
    EXPECT_LE(gates.back().sample, SampleIndex{10 * 1250});
    for (const auto& pulse : rig.journal.of(EventKind::pulse)) {
        EXPECT_LT(pulse.sample, SampleIndex{10 * 1250});
    }
}

TEST(PlanInTheLoop, EndsTheSessionWhereItIsTo) {
    ArbiterSettings arbiter;
    arbiter.plan = {{{"a", 7.0 / 60.0, true}, {"b", 3.0 / 60.0, false}}, true};
    Rig rig(armed(), arbiter);
    rig.loop.run();
    EXPECT_EQ(rig.loop.end(), LoopEnd::planned);
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 2U);
    EXPECT_EQ(rig.journal.of(EventKind::epoch).size(), 3U);
    EXPECT_GE(rig.loop.engine().next_sample(), SampleIndex{10 * 1250});
    EXPECT_LE(rig.loop.engine().next_sample(), SampleIndex{10 * 1250 + 10});
}

TEST(LimitsInTheLoop, ARunawayFaultsTheSession) {
    ArbiterSettings arbiter;
    arbiter.limits.runaway.equal_below_ms = 2'000.0; // the bursts, one a second, are what looks like one here
    arbiter.limits.runaway.equal_within_ms = 20.0;
    Rig rig(armed(), arbiter);
    rig.loop.run();
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 9U);
    const auto states = rig.journal.of(EventKind::state);
    ASSERT_GE(states.size(), 2U);
    EXPECT_EQ(states[1].as<StateDetail>().cause, static_cast<std::uint8_t>(StateCause::runaway));
}

TEST(LimitsInTheLoop, AFaultOrdersTheLineLowAtOnce) {
    ArbiterSettings arbiter;
    arbiter.limits.max_pulses_per_session = 1; // so that the one long pulse is not played into
    arbiter.limits.runaway.expected_per_s = 0.01;
    arbiter.limits.runaway.window_s = 10.0;
    arbiter.limits.runaway.false_alarms_per_hour = 1.0;
    Rig rig(armed());
    LevelOutput output;
    LineBoard board;
    PulseLines lines(std::vector<PulseLinePlan>{{&output, {10s, 1, 20s}, Follows::pulse}}, board, rig.ends);
    LiveLoop loop(armed(), rig.source, lines, rig.journal, rig.commands, rig.make_engine(arbiter));
    std::vector<bool> levels; // at the start of each second
    rig.source.before = [&](std::size_t frame) {
        if (frame % 1250 == 0) {
            levels.push_back(output.high);
        }
        return Received::frames;
    };
    loop.run();
    ASSERT_EQ(levels.size(), 20U);
    EXPECT_TRUE(levels[6] && levels[7]) << "else nothing is shown";
    EXPECT_FALSE(levels[8]) << "the third detection, in the seventh second, was one too many";
}

TEST(LiveLoop, AJournalThatFailsInAPulseOrdersTheLineLow) {
    ArbiterSettings arbiter;
    arbiter.limits.max_pulses_per_session = 1;
    Rig rig(armed());
    LevelOutput output;
    LineBoard board;
    PulseLines lines(std::vector<PulseLinePlan>{{&output, {10s, 1, 20s}, Follows::pulse}}, board, rig.ends);
    LiveLoop loop(armed(), rig.source, lines, rig.journal, rig.commands, rig.make_engine(arbiter));
    std::vector<bool> levels; // at the start of each second
    rig.source.before = [&](std::size_t frame) {
        if (frame % 1250 == 0) {
            levels.push_back(output.high);
            rig.journal.broken = frame == 8 * 1250; // as on a full disk
        }
        return Received::frames;
    };
    loop.run();
    ASSERT_GT(levels.size(), 9U);
    EXPECT_TRUE(levels[7] && levels[8]) << "else nothing is shown";
    EXPECT_FALSE(levels[9]);
}

TEST(LiveLoop, APulseRaisesTheLineOfItsConditionAndThoseOfAll) {
    Rig rig(armed());
    FailingOutput disrupt, delayed, any;
    const auto only = [](Condition condition) { return static_cast<std::uint8_t>(condition); };
    LineBoard board;
    PulseLines lines(std::vector<PulseLinePlan>{{&disrupt, {1ms, 1, 10ms}, Follows::pulse, only(Condition::disrupt)},
                                                {&delayed, {1ms, 1, 10ms}, Follows::pulse, only(Condition::delayed)},
                                                {&any, {1ms, 1, 10ms}, Follows::pulse}},
                     board, rig.ends);
    LiveLoop loop(armed(), rig.source, lines, rig.journal, rig.commands, rig.make_engine());
    loop.run();
    EXPECT_EQ(disrupt.rises, 15);
    EXPECT_EQ(delayed.rises, 0);
    EXPECT_EQ(any.rises, 15);
}

TEST(LiveLoop, AllocatesNothingFromStartToEnd) {
    Rig rig(armed());
    rig.source.before = [&](std::size_t frame) {
        if (frame == 9 * 1250) {
            rig.commands.push(Command::make(CommandKind::mark, std::string(100, 'x'))); // the string is the test's own
        }
        return Received::frames;
    };
    std::uint64_t allocations = 1;
    std::thread thread([&] {
        const test::AllocationGuard guard;
        rig.loop.run();
        allocations = guard.allocations();
    });
    thread.join();
    EXPECT_EQ(allocations, 1U) << "one: the test's own string";
    EXPECT_EQ(rig.journal.of(EventKind::pulse).size(), 15U);
}

} // namespace
} // namespace millpond
