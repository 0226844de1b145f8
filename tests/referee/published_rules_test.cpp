// Each rule of the referee against an implementation in NumPy and SciPy, written here from the papers' words.
#include "base/refusal.hpp"
#include "referee/invented_signal.hpp"
#include "referee/referee.hpp"
#include "referee/referee_rules.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <array>
#include <tuple>

namespace millpond {
namespace {

using test::ask_scipy;
using test::Signal;

// What all rules need; `x` has one column a site. Padding: first and last value stand for ever (zero_phase.hpp).
// Events are told as pairs of their first and last frame.
const std::string common_steps = R"(
fs = float(sys.argv[2])
def band(lo, hi):
    sos = signal.butter(3, [lo, hi], 'band', fs=fs, output='sos')
    return signal.sosfiltfilt(sos, x, axis=0, padtype=None)
def smooth(v, ms):
    g = lambda u: ndimage.gaussian_filter1d(u, ms * fs / 1000, mode='constant')
    return g(v) / g(np.ones_like(v))
def stretches(mask):
    d = np.diff(np.concatenate([[0], mask.astype(int), [0]]))
    return list(zip(np.where(d == 1)[0], np.where(d == -1)[0] - 1))
def ms(frames):
    return frames * 1000 / fs
def merge(events, gap_ms):
    out = []
    for a, b in events:
        if out and ms(a - out[-1][1]) < gap_ms:
            out[-1] = (out[-1][0], b)
        else:
            out.append((a, b))
    return out
def tell_events(events):
    print(*[f'{a} {b}' for a, b in events])
)";

// Gillespie et al. 2024, eLife 90944 [seen]: 'square, sum over sites, Gaussian SD 4 ms, square root' of 150-250 Hz; '2
// SD for 15 ms or more'; 'edges at the mean'.
const std::string gillespie = R"(
e = np.sqrt(smooth((band(150, 250)**2).sum(axis=1), 4))
found = []
for a, b in stretches(e > e.mean()):
    if any(ms(q - p) >= 15 for p, q in stretches(e[a:b + 1] >= e.mean() + 2 * e.std())):
        found.append((a, b))
tell_events(found)
)";

// Deceuninck & Kloosterman 2024, eLife 13:e84004 [seen]: 140-225 Hz, 'analytic envelope, mean over sites, Gaussian 15
// ms'; threshold 'median + 9 (Q3 - median)'; 'merge gaps < 20 ms; drop < 40 ms'. Edges at the threshold: chosen here.
const std::string deceuninck = R"(
e = smooth(np.abs(signal.hilbert(band(140, 225), axis=0)).mean(axis=1), 15)
m, q3 = np.quantile(e, [0.5, 0.75])
tell_events([(a, b) for a, b in merge(stretches(e > m + 9 * (q3 - m)), 20) if ms(b - a) >= 40])
)";

// Stark et al. 2014, Neuron 83:467 [from memory]: 'clip at 4 SD before taking mean and SD; detect 5 SD, edges 1 SD;
// merge and drop < 15 ms'. Band and envelope are ours, as the header says.
const std::string stark = R"(
e = np.sqrt(smooth((band(150, 250)**2).sum(axis=1), 4))
c = np.minimum(e, e.mean() + 4 * e.std())
m, s = c.mean(), c.std()
found = [(a, b) for a, b in stretches(e > m + s) if e[a:b + 1].max() >= m + 5 * s]
tell_events([(a, b) for a, b in merge(found, 15) if ms(b - a) >= 15])
)";

// Our default: the same, clipped at 3 SD again and again.
const std::string ours = R"(
e = np.sqrt(smooth((band(150, 250)**2).sum(axis=1), 4))
c = e
for _ in range(60):
    m, s = c.mean(), c.std()
    c = np.minimum(e, m + 3 * s)
found = [(a, b) for a, b in stretches(e > m + s) if e[a:b + 1].max() >= m + 5 * s]
tell_events([(a, b) for a, b in merge(found, 15) if ms(b - a) >= 15])
)";

// Ripples from small to large and short to long, doublets whose gaps straddle the merge gaps, and noise.
Signal invented(double rate) {
    Signal signal(Hertz{rate}, 3, rate > 10000.0 ? 15.0 : 90.0);
    signal.add_noise(10.0 * std::sqrt(rate / 1250.0)); // the same density in the band
    const double seconds = static_cast<double>(signal.data.size() / 3) / rate;
    int number = 0;
    for (double at = 1.0; at + 1.0 < seconds; at += 0.9, ++number) {
        const double amplitude = 25.0 + 15.0 * (number % 9), hull_ms = 8.0 + 5.0 * (number % 5);
        signal.add_ripple(at, amplitude, hull_ms);
        if (number % 3 == 0) {
            signal.add_ripple(at + 0.09 + 0.01 * (number % 4), amplitude, hull_ms);
        }
    }
    return signal;
}

using Case = std::tuple<RefereeRule, const std::string*, double>;

class RuleAgainstScipy : public testing::TestWithParam<Case> {};

TEST_P(RuleAgainstScipy, FindsTheSameEventsWithTheSameEdges) {
    MILLPOND_NEEDS_SCIPY();
    const auto& [rule, script, rate] = GetParam();
    const auto signal = invented(rate);
    auto settings = settings_of(rule);
    settings.artefacts.exclude = false;
    const auto found = find_ripples(settings, ripple_channels(3), signal.rate, signal.block()).ripples;
    const auto theirs = ask_scipy(common_steps + *script, signal.data, 3, std::to_string(rate));
    ASSERT_EQ(2 * found.size(), theirs.size());
    EXPECT_GT(found.size(), rate > 10000.0 ? 5U : 30U);
    // A threshold that falls between two frames may fall to either in the last digit; more frames are no rounding.
    const double most = 1.0 + 0.0001 * rate;
    for (std::size_t i = 0; i < found.size(); ++i) {
        EXPECT_NEAR(static_cast<double>(found[i].onset.value), theirs[2 * i], most) << i;
        EXPECT_NEAR(static_cast<double>(found[i].end.value), theirs[2 * i + 1], most) << i;
    }
}

std::string name_of_case(const testing::TestParamInfo<Case>& info) {
    const auto rate = std::get<2>(info.param);
    return std::string(word_for<RefereeRule>(referee_rules, std::get<0>(info.param))) + "_at_" +
           std::to_string(static_cast<int>(rate)) + "_Hz";
}
INSTANTIATE_TEST_SUITE_P(Rules, RuleAgainstScipy,
                         testing::Values(Case{RefereeRule::millpond, &ours, 1250.0},
                                         Case{RefereeRule::gillespie_2024, &gillespie, 1250.0},
                                         Case{RefereeRule::deceuninck_2024, &deceuninck, 1250.0},
                                         Case{RefereeRule::deceuninck_2024, &deceuninck, 30000.0},
                                         Case{RefereeRule::stark_2014, &stark, 1250.0}),
                         name_of_case);

TEST(AnalyticEnvelope, IsScipysHilbertMagnitudeMeanOverSites) {
    MILLPOND_NEEDS_SCIPY();
    Signal signal(Hertz{1250.0}, 2, 10.0);
    signal.add_noise(20.0);
    signal.add_ripple(5.0, 150.0, 20.0, 1);
    auto settings = settings_of(RefereeRule::deceuninck_2024);
    settings.artefacts.exclude = false;
    auto referee = Referee::make(settings, ripple_channels(2), signal.rate);
    referee.add(signal.block());
    static_cast<void>(referee.finish());
    const auto theirs =
        ask_scipy(common_steps + "tell(smooth(np.abs(signal.hilbert(band(140, 225), axis=0)).mean(axis=1), 15))",
                  signal.data, 2, "1250");
    ASSERT_EQ(referee.envelope().size(), theirs.size());
    for (std::size_t i = 200; i + 200 < theirs.size(); ++i) { // Hilbert by FFT wraps round at the ends
        ASSERT_NEAR(static_cast<double>(referee.envelope()[i]), theirs[i], 0.001 * theirs[i] + 0.002) << i;
    }
}

TEST(AnalyticEnvelope, OfASineOnEverySiteIsItsAmplitude) {
    Signal signal(Hertz{30000.0}, 2, 1.0);
    for (std::size_t f = 0; f < signal.data.size() / 2; ++f) {
        const auto value = 160.0 * std::sin(2.0 * std::numbers::pi * 177.5 * static_cast<double>(f) / 30000.0);
        signal.data[2 * f] = signal.data[2 * f + 1] = static_cast<float>(value);
    }
    auto referee = Referee::make(settings_of(RefereeRule::deceuninck_2024), ripple_channels(2), signal.rate);
    referee.add(signal.block());
    static_cast<void>(referee.finish());
    EXPECT_NEAR(static_cast<double>(referee.envelope()[15000]), 160.0, 0.3);
}

TEST(PublishedRule, FindsTheSameInPiecesAsWhole) {
    const auto signal = invented(1250.0);
    const auto block = signal.block();
    for (const auto& rule : referee_rules) {
        const auto settings = settings_of(rule.value);
        auto referee = Referee::make(settings, ripple_channels(3), signal.rate);
        for (std::size_t at = 0; at < block.frames(); at += 37) {
            referee.add(block.part(at, std::min<std::size_t>(37, block.frames() - at)));
        }
        EXPECT_EQ(referee.finish().ripples, find_ripples(settings, ripple_channels(3), signal.rate, block).ripples)
            << rule.word;
    }
}

TEST(PublishedRule, OfDeceuninckFindsNothingAcrossMissingFrames) {
    Signal signal(Hertz{1250.0}, 1, 30.0);
    signal.add_noise(10.0);
    signal.add_ripple(10.0, 300.0, 60.0);
    auto settings = settings_of(RefereeRule::deceuninck_2024);
    settings.artefacts.exclude = false;
    signal.data[12500] = std::numeric_limits<float>::quiet_NaN();
    for (const auto& ripple : find_ripples(settings, ripple_channels(1), signal.rate, signal.block()).ripples) {
        EXPECT_TRUE(ripple.end.value < 12500 || ripple.onset.value > 12500);
    }
}

TEST(PublishedRule, FixesItsKeysAndSaysSo) {
    for (const auto& rule : referee_rules) {
        EXPECT_FALSE(departure_from_rule(settings_of(rule.value)));
        EXPECT_EQ(rule_named(rule.word), rule.value);
    }
    EXPECT_FALSE(rule_named("nobody_1999"));
    auto settings = settings_of(RefereeRule::gillespie_2024);
    settings.artefacts.pad_ms = 50.0; // free
    EXPECT_NO_THROW(static_cast<void>(Referee::make(settings, ripple_channels(1), Hertz{1250.0})));
    settings.peak_deviations = 3.0;
    try {
        static_cast<void>(Referee::make(settings, ripple_channels(1), Hertz{1250.0}));
        FAIL() << "taken";
    } catch (const Refusal& refusal) {
        EXPECT_NE(std::string(refusal.what())
                      .find("referee.peak_deviations: found 3.0; allowed: 2.0, which rule "
                            "gillespie_2024 fixes"),
                  std::string::npos)
            << refusal.what();
    }
    settings.rule = RefereeRule::millpond;
    EXPECT_NO_THROW(static_cast<void>(Referee::make(settings, ripple_channels(1), Hertz{1250.0})));
}

} // namespace
} // namespace millpond
