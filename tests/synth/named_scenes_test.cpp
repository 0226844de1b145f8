#include "support/python.hpp"
#include "synth/bare_scene.hpp"
#include "synth/named_scenes.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::live_through;

SceneSettings shortened(SceneName name, double seconds) {
    auto scene = named_scene(name);
    scene.duration_s = seconds;
    return scene;
}

TEST(NamedScenes, GiveTheSameBitsAtAnyBlockSize) {
    for (const auto& name : scene_names) {
        const auto settings = shortened(name.value, 20.0);
        const auto whole = live_through(settings).frames;
        for (const std::size_t block : {1u, 7u, 1000u}) {
            auto scene = Scene::make(settings);
            const auto channels = scene.channels().size();
            std::vector<float> frames(block * channels), all;
            while (const auto made = scene.next(frames)) {
                all.insert(all.end(), frames.begin(), frames.begin() + static_cast<std::ptrdiff_t>(made * channels));
            }
            ASSERT_EQ(all, whole) << name.word << ", " << block << " frames a block";
        }
    }
}

TEST(NamedScenes, AnotherSeedGivesOtherRipples) {
    for (const auto& name : scene_names) {
        auto other = shortened(name.value, 60.0);
        const auto truth = live_through(other).truth;
        other.seed = 2;
        const auto others = live_through(other).truth;
        ASSERT_FALSE(truth.empty());
        ASSERT_FALSE(others.empty());
        EXPECT_NE(truth.front().onset, others.front().onset) << name.word;
    }
}

// What is drawn once an event comes at the same time at any rate; what a filter makes of noise does not.
TEST(NamedScenes, RipplesStatesAndArtefactsComeAtTheSameTimesAtAnyRate) {
    for (const auto name : {SceneName::typical, SceneName::hard}) {
        auto slow = shortened(name, 40.0), fast = slow;
        fast.rate_hz = 30'000.0;
        const auto a = live_through(slow), b = live_through(fast);
        ASSERT_GE(a.truth.size(), 6u);
        ASSERT_EQ(a.truth.size(), b.truth.size());
        for (std::size_t i = 0; i < a.truth.size(); ++i) {
            const double frame_s = 1.01 / 1250.0;
            EXPECT_NEAR(seconds_at(a.truth[i].onset, Hertz{1250.0}), seconds_at(b.truth[i].onset, Hertz{30e3}),
                        frame_s);
            EXPECT_NEAR(seconds_at(a.truth[i].end, Hertz{1250.0}), seconds_at(b.truth[i].end, Hertz{30e3}), frame_s);
            EXPECT_NEAR(a.truth[i].amplitude_uv / b.truth[i].amplitude_uv, 1.0, 0.02);
        }
        for (const auto kind : {HappeningKind::rest, HappeningKind::run, HappeningKind::gamma, HappeningKind::spike,
                                HappeningKind::step, HappeningKind::muscle}) {
            const auto c = a.of(kind), d = b.of(kind);
            ASSERT_EQ(c.size(), d.size());
            for (std::size_t i = 0; i < c.size(); ++i) {
                EXPECT_NEAR(c[i].onset_s, d[i].onset_s, 1e-9);
            }
        }
    }
}

TEST(NamedScenes, AllowOneSiteAndSixtyFour) {
    for (const int sites : {1, 64}) {
        auto settings = shortened(SceneName::typical, 20.0);
        settings.sites = sites;
        settings.site_spacing_um = 20.0;
        const auto lived = live_through(settings);
        EXPECT_EQ(lived.frames.size(), (static_cast<std::size_t>(sites) + 1) * 25'000);
        EXPECT_TRUE(std::all_of(lived.frames.begin(), lived.frames.end(), [](float v) { return std::isfinite(v); }));
    }
}

TEST(NamedScenes, RunningIsOneSiteThatNeverRests) {
    const auto lived = live_through(shortened(SceneName::running, 60.0));
    EXPECT_EQ(lived.frames.size(), 75'000u);
    EXPECT_EQ(lived.of(HappeningKind::run).size(), 1u);
    EXPECT_TRUE(lived.of(HappeningKind::rest).empty());
    EXPECT_GE(lived.truth.size(), 10u);
    EXPECT_GE(lived.of(HappeningKind::spikes).size(), 200u) << "7.5 cycles a second, 0.7 of them with a burst";
}

/// Share of ripples that a chain made of SciPy's filters finds with at most one false detection a minute, the highest
/// of all thresholds. `envelope` makes `e`, one column a channel, from `x`.
double found(SceneName name, const std::string& envelope) {
    const auto settings = named_scene(name);
    const auto lived = live_through(settings);
    std::string intervals;
    for (const auto& ripple : lived.truth) {
        intervals += std::to_string(ripple.onset.value) + " " + std::to_string(ripple.end.value) + " ";
    }
    const auto channels = static_cast<std::size_t>(settings.sites + (settings.reference ? 1 : 0));
    const auto said = test::ask_scipy(
        "def smooth(v, ms):\n"
        "    a = np.exp(-1000 / ms / 1250); return signal.lfilter([1 - a], [1, -a], v, axis=0)\n"
        "def band(low, high, order=2):\n"
        "    s = signal.butter(order, (low, high), 'band', fs=1250, output='sos')\n"
        "    return smooth(abs(signal.sosfilt(s, x, axis=0)), 10)\n" +
            envelope +
            "\n"
            "def deviations(v):\n"
            "    c = np.minimum(v, np.median(v) + 6 * np.median(abs(v - np.median(v))))\n"
            "    a = np.exp(-1 / 20 / 1250); f = lambda u: signal.lfilter([1 - a], [1, -a], u, zi=[u.mean() * a])[0]\n"
            "    m = f(c); return (v - m) / np.sqrt(f((c - m) ** 2))\n"
            "sites = " +
            std::to_string(settings.sites) +
            "\n"
            "z = deviations(e[:, :sites].mean(1))\n"
            "veto = np.zeros(len(z), bool)\n"
            "if e.shape[1] > sites: veto = np.convolve(deviations(e[:, -1]) > 4, np.ones(25))[:len(z)] > 0\n"
            "w = np.array(sys.argv[2:], int).reshape(-1, 2); best = 0\n"
            "for k in np.arange(30, 2, -0.25):\n"
            "    hit = set(); false = 0; last = -1000\n"
            "    for i in np.flatnonzero((z[1:] > k) & (z[:-1] <= k)) + 1:\n"
            "        if i < 18750 or i - last < 125 or veto[i]: continue\n"
            "        last = i; j = np.searchsorted(w[:, 0], i, 'right') - 1\n"
            "        if j >= 0 and i <= w[j, 1]: hit.add(j)\n"
            "        else: false += 1\n"
            "    if false <= (len(z) / 1250 - 15) / 60: best = max(best, len(hit) / len(w))\n"
            "    elif false > len(z) / 1250 / 10: break\n"
            "print(best)",
        lived.frames, channels, intervals);
    return said.at(0);
}

class ToATextbookChain : public ::testing::Test {
  protected:
    void SetUp() override { MILLPOND_NEEDS_SCIPY(); }
    static constexpr auto textbook = "e = band(150, 250)";
};

TEST_F(ToATextbookChain, QuietIsEasyTypicalIsNotAndHardIsHard) {
    EXPECT_GT(found(SceneName::quiet, textbook), 0.93);
    const double typical = found(SceneName::typical, textbook);
    EXPECT_GT(typical, 0.70);
    EXPECT_LT(typical, 0.88);
    const double hard = found(SceneName::hard, textbook);
    EXPECT_GT(hard, 0.35);
    EXPECT_LT(hard, 0.65);
}

TEST_F(ToATextbookChain, RipplesInRunningAreLostAndContrastWithTheBandAboveFindsThem) {
    EXPECT_LT(found(SceneName::running, textbook), 0.05);
    EXPECT_GT(found(SceneName::running, "e = band(150, 250, 1) - band(320, 560, 1)"), 0.6);
}

} // namespace
} // namespace millpond
