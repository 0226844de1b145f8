#include "base/refusal.hpp"
#include "detector/bandpass_design.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <numbers>
#include <sstream>

namespace millpond {
namespace {

FilterSettings filter_of(FilterFamily family, int order) {
    FilterSettings filter;
    filter.family = family;
    filter.order = order;
    return filter;
}

// Butterworth 1930: |H|^2 = 1 / (1 + s^2n), s the low-pass frequency that the band transform maps to, warped as the
// bilinear transform warps it.
double butterworth_magnitude(double hz, double rate, double low, double high, int order) {
    const auto warped = [&](double f) { return std::tan(std::numbers::pi * f / rate); };
    const double w = warped(hz), centre_squared = warped(low) * warped(high);
    const double s = (w * w - centre_squared) / (w * (warped(high) - warped(low)));
    return 1.0 / std::sqrt(1.0 + std::pow(s, 2 * order));
}

TEST(BandpassDesign, ButterworthFollowsItsFormulaFrom500HzTo50KHz) {
    for (const double rate : {625.0, 1000.0, 1250.0, 2000.0, 20000.0, 30000.0, 50000.0}) {
        for (int order = 1; order <= 8; ++order) {
            const auto design = design_bandpass(filter_of(FilterFamily::butterworth, order), Hertz{rate}, "test");
            for (double hz = 5.0; hz < rate / 2.0 - 1.0; hz *= 1.07) {
                EXPECT_NEAR(std::abs(design.response(Hertz{hz}, Hertz{rate})),
                            butterworth_magnitude(hz, rate, 150.0, 250.0, order), 2e-5)
                    << rate << " Hz, order " << order << ", at " << hz;
            }
        }
    }
}

// Group delay at the centre of a Butterworth band-pass of prototype order n: 1 / (pi BW sin(pi / 2n)), by the low-pass
// to band-pass map; for 100 Hz: 3.2, 4.5, 6.4, 8.3 ms. The digital filter's band is warped, so the rate is high here.
TEST(BandpassDesign, ButterworthDelayAtTheCentreFollowsItsFormula) {
    for (int order = 1; order <= 4; ++order) {
        const auto filter = filter_of(FilterFamily::butterworth, order);
        const Hertz rate{30000.0};
        const double delay_s =
            design_bandpass(filter, rate, "test").group_delay_samples(band_centre(filter), rate) / rate.value;
        const double formula_s = 1.0 / (std::numbers::pi * 100.0 * std::sin(std::numbers::pi / (2.0 * order)));
        EXPECT_NEAR(delay_s, formula_s, formula_s * 0.01) << "order " << order;
    }
}

struct ScipyCase {
    FilterFamily family;
    const char* call;
    double tolerance;
};

// Reference: SciPy's butter, cheby2 and ellip as second-order sections, evaluated by sosfreqz. The elliptic prototype's
// single precision shifts the steepest edges by a hair, hence its tolerance.
TEST(BandpassDesign, EveryFamilyHasTheMagnitudeOfScipysDesign) {
    const ScipyCase cases[] = {
        {FilterFamily::butterworth, "signal.butter(n, band, 'bandpass', fs=fs, output='sos')", 2e-5},
        {FilterFamily::chebyshev2, "signal.cheby2(n, 40, band, 'bandpass', fs=fs, output='sos')", 1e-4},
        {FilterFamily::elliptic, "signal.ellip(n, 0.5, 40, band, 'bandpass', fs=fs, output='sos')", 1e-3}};
    std::string program = "import numpy as np\nfrom scipy import signal\nband = [150, 250]\n";
    for (const auto& each : cases) {
        program += "for n in [1, 2, 3, 4, 5, 8]:\n  for fs in [1250.0, 30000.0]:\n    sos = " + std::string(each.call) +
                   "\n    for v in abs(signal.sosfreqz(sos, np.arange(20, 600, 7.0), fs=fs)[1]): print('%.9f' % v)\n";
    }
    std::istringstream reference(test::python(program));
    for (const auto& each : cases) {
        for (const int order : {1, 2, 3, 4, 5, 8}) {
            for (const double rate : {1250.0, 30000.0}) {
                const auto design = design_bandpass(filter_of(each.family, order), Hertz{rate}, "test");
                for (double hz = 20.0; hz < 600.0; hz += 7.0) {
                    double expected = -1.0;
                    reference >> expected;
                    EXPECT_NEAR(std::abs(design.response(Hertz{hz}, Hertz{rate})), expected, each.tolerance)
                        << each.call << ", order " << order << ", rate " << rate << ", at " << hz;
                }
            }
        }
    }
}

TEST(BandpassDesign, MinimumPhaseFirPassesTheBandStopsTheRestAndDelaysLessThanLinearPhase) {
    const auto filter = filter_of(FilterFamily::fir_minimum_phase, 2);
    for (const double rate : {1250.0, 30000.0}) {
        const auto design = design_bandpass(filter, Hertz{rate}, "test");
        EXPECT_NEAR(std::abs(design.response(band_centre(filter), Hertz{rate})), 1.0, 1e-6);
        // Half the 60 Hz transition lies outside each edge; 40 dB is 0.01.
        for (const double hz : {50.0, 100.0, 115.0, 285.0, 400.0}) {
            EXPECT_LT(std::abs(design.response(Hertz{hz}, Hertz{rate})), 0.012) << hz << " at " << rate;
        }
        const double linear_phase_delay = (static_cast<double>(design.taps.size()) - 1.0) / 2.0;
        EXPECT_LT(design.group_delay_samples(band_centre(filter), Hertz{rate}), 0.7 * linear_phase_delay);
    }
}

TEST(BandpassDesign, RefusesABandThatReachesHalfTheRate) {
    FilterSettings filter;
    EXPECT_THROW((void)design_bandpass(filter, Hertz{500.0}, "test"), Refusal);
    filter.low_hz = 260.0;
    EXPECT_THROW((void)design_bandpass(filter, Hertz{1250.0}, "test"), Refusal);
}

} // namespace
} // namespace millpond
