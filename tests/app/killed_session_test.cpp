// `kill -9` of a live session at random moments: what can be read afterwards, by the program's own audit and by its
// reader.
#include "app/rig.hpp"
#include "base/clock.hpp"

#include <atomic>
#include <random>

namespace millpond::testing {
namespace {

/// How long this computer lets a thread wait that asked to sleep 10 ms: what a busy machine adds to any writer's
/// lateness.
class StallProbe {
  public:
    StallProbe() : thread_([this] { run(); }) {}
    ~StallProbe() {
        stopping_ = true;
        thread_.join();
    }
    StallProbe(const StallProbe&) = delete;
    StallProbe& operator=(const StallProbe&) = delete;
    /// The longest stall since the last call.
    Nanos longest() { return Nanos{longest_.exchange(0)}; }

  private:
    void run() {
        while (!stopping_) {
            const auto before = monotonic_now();
            std::this_thread::sleep_for(std::chrono::milliseconds{10});
            const auto stall = (monotonic_now() - before - std::chrono::milliseconds{10}).count();
            longest_ = std::max<std::int64_t>(longest_, stall);
        }
    }
    std::atomic<bool> stopping_{false};
    std::atomic<std::int64_t> longest_{0};
    std::thread thread_;
};

struct Kill {
    double lost_ms;  ///< from the last readable record to the kill
    double stall_ms; ///< longest stall of a thread of ours meanwhile
};

double milliseconds(Nanos time) {
    return static_cast<double>(time.count()) / 1e6;
}

constexpr int last_round = 4;

/// A decision is on the disk, and something later.
bool has_decided(const std::filesystem::path& folder) {
    const SessionReader read(folder);
    return std::any_of(read.events().begin(), read.events().end(), [&](const Event& event) {
        return event.kind == EventKind::detection && event.sample < read.end();
    });
}

class KilledSession : public ::testing::TestWithParam<unsigned> {};

// Five sessions a batch, four batches: twenty.
TEST_P(KilledSession, AllButTheLast100MsIsReadableSaysThatItWasCutAndDecidesTheSameAgain) {
    Rig rig;
    const auto recording = rig.recording(30.0);
    const auto sender = rig.feed(recording, {"--loop", "--speed", "2"});
    std::mt19937 random(GetParam());
    StallProbe probe;
    std::vector<Kill> kills;
    for (int round = 0; round <= last_round; ++round) {
        RigSettings want;
        want.folder = "sessions" + std::to_string(round); // a folder's name has no more than the second of its start
        const auto session = rig.live(rig.settings(want));
        const auto folder = Rig::folder_of(*session);
        ASSERT_TRUE(wait_until([&] { return Rig::frames_stored(folder) > 0; })) << session->err();
        if (round == last_round) {
            ASSERT_TRUE(wait_until([&] { return has_decided(folder); })) << session->err();
        }
        std::this_thread::sleep_for(std::chrono::milliseconds{std::uniform_int_distribution{0, 1500}(random)});
        probe.longest();
        std::this_thread::sleep_for(
            std::chrono::milliseconds{150}); // the probe sees what the journal's last drains saw
        session->send(SIGKILL);
        const auto killed = realtime_now();
        ASSERT_EQ(session->status(), 128 + SIGKILL);
        const auto stall = probe.longest();

        const SessionReader read(folder);
        EXPECT_TRUE(read.cut());
        EXPECT_TRUE(read.damage().empty());
        ASSERT_FALSE(read.events().empty());
        kills.push_back({milliseconds(killed - Nanos{read.events().back().time_ns}), milliseconds(stall)});
        // What one thread is made to wait, the journal's may have to wait twice: before it reads and before it writes.
        EXPECT_LE(kills.back().lost_ms, 100.0 + 2.0 * kills.back().stall_ms) << "round " << round;
        // Samples go with the records: no record speaks of a place more than 100 ms (at twice the pace) behind them.
        EXPECT_GE(Rig::frames_stored(folder) + 250, read.end().value);

        const auto audit = rig.audit(folder);
        EXPECT_TRUE(audit.at("cut"));
        const auto& again = audit.at("rerun");
        if (read.end().value == 0) { // killed before the engine had said anything: nothing is there to decide again
            EXPECT_EQ(again.at("why_not"), "the session has no stretch with both samples and records");
        } else {
            EXPECT_TRUE(again.at("done")) << again;
            EXPECT_TRUE(again.at("reproduced")) << again;
            EXPECT_EQ(again.at("upto_sample"), std::min(read.end().value, Rig::frames_stored(folder)));
        }
        if (round == last_round) {
            EXPECT_GE(again.at("decisions_compared"), 1) << again;
        }
        EXPECT_NE(rig.millpond("audit " + folder.string()).out.find("CUT"), std::string::npos);
    }
    for (const auto& kill : kills) {
        std::printf("killed: last record %.1f ms before; this computer stalled %.1f ms\n", kill.lost_ms, kill.stall_ms);
    }
    EXPECT_TRUE(sender->running());
}

INSTANTIATE_TEST_SUITE_P(TwentyAtRandomMoments, KilledSession, ::testing::Values(11U, 23U, 37U, 41U));

} // namespace
} // namespace millpond::testing
