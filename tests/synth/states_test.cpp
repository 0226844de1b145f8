#include "support/python.hpp"
#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

using test::live_through;
using test::silent;

SceneSettings resting_and_running() {
    auto settings = test::bare();
    settings.duration_s = 3000.0;
    settings.states.rest_s = 30.0;
    settings.states.run_s = 12.0;
    return settings;
}

TEST(States, FollowEachOtherWithoutGapsAndBothLastAsLongAsAskedFor) {
    const auto lived = live_through(resting_and_running());
    const auto& all = lived.happenings;
    ASSERT_GE(all.size(), 100u);
    EXPECT_EQ(all.front().onset_s, 0.0);
    EXPECT_EQ(all.front().kind, HappeningKind::rest);
    double lengths[2] = {};
    for (std::size_t i = 0; i + 1 < all.size(); ++i) {
        ASSERT_EQ(all[i].end_s, all[i + 1].onset_s);
        ASSERT_NE(all[i].kind, all[i + 1].kind);
        lengths[i % 2] += (all[i].end_s - all[i].onset_s) / (0.5 * static_cast<double>(all.size() - 1));
    }
    EXPECT_GE(all.back().end_s, 3000.0);
    // Log SD 0.5: a mean over some 70 has a deviation of 6 %.
    EXPECT_NEAR(lengths[0] / 30.0, 1.0, 0.2);
    EXPECT_NEAR(lengths[1] / 12.0, 1.0, 0.2);
}

TEST(States, BeginAsAskedForAndOneAloneNeverEnds) {
    auto settings = resting_and_running();
    settings.duration_s = 100.0;
    settings.states.first = AnimalState::run;
    EXPECT_EQ(live_through(settings).happenings.front().kind, HappeningKind::run);
    settings.states.rest_s = 0.0;
    EXPECT_EQ(live_through(settings).happenings.size(), 1u);
    settings.states.run_s = 0.0;
    EXPECT_TRUE(live_through(settings).happenings.empty()) << "no states";
}

TEST(States, RunningHoldsTheShareOfRipplesAskedFor) {
    for (const double share : {0.0, 0.3, 1.0}) {
        auto settings = resting_and_running();
        settings.states.ripples_in_run = share;
        settings.states.rest_s = settings.states.run_s = 20.0;
        const auto lived = live_through(settings);
        double seconds = 0.0;
        int ripples = 0;
        for (const auto& run : lived.of(HappeningKind::run)) {
            seconds += std::min(run.end_s, 3000.0) - run.onset_s;
            for (const auto& ripple : lived.truth) {
                // The onset in the truth is a frame after the onset that was drawn, or less.
                const double onset_s = seconds_at(ripple.onset, Hertz{1250.0});
                ripples += onset_s > run.onset_s + 0.001 && onset_s < run.end_s ? 1 : 0;
            }
        }
        const double expected = 0.5 * share * seconds;
        EXPECT_NEAR(ripples, expected, 4.0 * std::sqrt(expected)) << share;
    }
}

class StatesInSciPy : public ::testing::Test {
  protected:
    void SetUp() override { MILLPOND_NEEDS_SCIPY(); }
};

// scipy.signal.welch within the states that the truth says, a second after each change.
TEST_F(StatesInSciPy, RunningHoldsThetaAndRestDelta) {
    auto settings = silent(1);
    settings.duration_s = 600.0;
    settings.states.rest_s = settings.states.run_s = 20.0;
    settings.theta.amplitude_uv = 200.0;
    settings.delta.rms_uv = 150.0;
    const auto lived = live_through(settings);
    std::string states;
    for (const auto& each : lived.happenings) {
        states += std::to_string(each.kind == HappeningKind::run ? 1 : 0) + " " + std::to_string(each.onset_s + 1.0) +
                  " " + std::to_string(std::min(each.end_s, 600.0)) + " ";
    }
    const auto said =
        test::ask_scipy("w = np.array(sys.argv[2:], float).reshape(-1, 3); power = np.zeros((2, 2)); n = [0, 0]\n"
                        "for s, a, b in w:\n"
                        "    if b - a < 5: continue\n"
                        "    f, p = signal.welch(x[int(a*1250):int(b*1250), 0], 1250, nperseg=2500)\n"
                        "    s = int(s); n[s] += 1\n"
                        "    power[s] += [p[(f >= 1) & (f <= 4)].sum() / 2, p[(f >= 5) & (f <= 10)].sum() / 2]\n"
                        "print(*np.sqrt(power / np.array(n)[:, None]).ravel(), *n)",
                        lived.frames, 1, states);
    ASSERT_EQ(said.size(), 6u);
    EXPECT_NEAR(said[0], 150.0, 25.0) << "delta in rest, rms";
    EXPECT_LT(said[1], 15.0) << "theta in rest";
    EXPECT_LT(said[2], 10.0) << "delta in running";
    EXPECT_NEAR(said[3], 200.0 / std::sqrt(2.0), 10.0) << "theta in running";
    EXPECT_GE(said[4] + said[5], 10.0);
}

} // namespace
} // namespace millpond
