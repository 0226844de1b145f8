#include "live/live_loop.hpp"
#include "outputs/silent_output.hpp"
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
    void take(const Event& event) noexcept override { events.push_back(event); }
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
    std::atomic<bool> works{true};
    bool set_line(bool /*high*/) noexcept override { return works; }
};

/// A whole loop without a device: settle 2 s, a burst a second from 5 s on.
struct Rig {
    ScriptedSource source{bursts(), 2};
    FailingOutput output;
    NoEnds ends;
    PulseLine line{output, {1ms, 1, 10ms}, ends};
    KeptJournal journal;
    SpscRing<Command> commands{64};
    LiveLoop loop;

    explicit Rig(LiveLoopSettings settings, ArbiterSettings arbiter = {})
        : loop(settings, source, line, journal, commands, [&](EventSink& sink, PulsePort& port) {
              DetectorSettings detector;
              detector.method = DetectionMethod::envelope;
              detector.floor.settle_s = 2.0;
              detector.threshold.deviations = 6.0;
              return Engine(Detector::make(detector, ripple_channels(2), rate), arbiter, {}, rate, sink, port);
          }) {}

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
