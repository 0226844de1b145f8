#include "detector/bandpass_design.hpp"

#include "base/refusal.hpp"
#include "detector/minimum_phase.hpp"

#include <liquid/liquid.h>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <numbers>
#include <string>

namespace millpond {
namespace {

using Complex = std::complex<double>;

// Library functions differ between processors in the last bit. Forty bits are far more than a filter needs, and
// rounding to them makes the coefficients, and so every decision, the same everywhere.
double rounded(double value) {
    int exponent = 0;
    const double mantissa = std::frexp(value, &exponent);
    return std::ldexp(std::nearbyint(std::ldexp(mantissa, 40)), exponent - 40);
}

std::string in_hertz(double value) {
    char text[32];
    std::snprintf(text, sizeof text, "%g Hz", value);
    return text;
}

struct Prototype {
    std::vector<Complex> zeros, poles;
    double gain_at_zero;
};

std::vector<Complex> widened(const std::vector<liquid_float_complex>& values, std::size_t count) {
    std::vector<Complex> wide;
    for (std::size_t i = 0; i < count; ++i) {
        wide.emplace_back(values[i].real(), values[i].imag());
    }
    return wide;
}

// The library's prototypes are single precision, and good to seven digits; all that follows is double, since a band of
// 150-250 Hz at 30 kHz puts the poles so close to the unit circle that single precision would not do.
Prototype prototype_of(const FilterSettings& settings) {
    const auto order = static_cast<unsigned>(settings.order);
    std::vector<liquid_float_complex> zeros(order + 1), poles(order + 1);
    liquid_float_complex gain{};
    const double pass_gain = std::pow(10.0, -settings.passband_ripple_db / 20.0);
    const double stop_gain = std::pow(10.0, -settings.stopband_db / 20.0);
    const std::size_t finite_zeros = std::size_t{2} * (order / 2);
    switch (settings.family) {
    case FilterFamily::butterworth:
        butter_azpkf(order, zeros.data(), poles.data(), &gain);
        return {{}, widened(poles, order), 1.0};
    case FilterFamily::chebyshev2: {
        const double epsilon = stop_gain / std::sqrt(1.0 - stop_gain * stop_gain);
        cheby2_azpkf(order, static_cast<float>(epsilon), zeros.data(), poles.data(), &gain);
        return {widened(zeros, finite_zeros), widened(poles, order), 1.0};
    }
    default: {
        const double pass_epsilon = std::sqrt(1.0 / (pass_gain * pass_gain) - 1.0);
        const double stop_epsilon = std::sqrt(1.0 / (stop_gain * stop_gain) - 1.0);
        ellip_azpkf(order, static_cast<float>(pass_epsilon), static_cast<float>(stop_epsilon), zeros.data(),
                    poles.data(), &gain);
        return {widened(zeros, finite_zeros), widened(poles, order), order % 2 == 0 ? pass_gain : 1.0};
    }
    }
}

// Low-pass to band-pass, s -> (s^2 + centre^2) / (width s), then bilinear, z = (1 + s) / (1 - s).
std::vector<Complex> to_digital_band(const std::vector<Complex>& roots, double centre, double width) {
    std::vector<Complex> digital;
    for (const Complex root : roots) {
        const Complex half = root * (width / 2.0);
        const Complex spread = std::sqrt(half * half - centre * centre);
        for (const Complex s : {half + spread, half - spread}) {
            digital.push_back((1.0 + s) / (1.0 - s));
        }
    }
    return digital;
}

struct Quadratic {
    double c1, c2; ///< z^2 + c1 z + c2
    Complex root;  ///< one of its roots, of positive imaginary part where there is one
};

// Conjugate roots pair with each other, real ones with the next real one.
std::vector<Quadratic> paired(const std::vector<Complex>& roots) {
    std::vector<Quadratic> pairs;
    std::vector<double> reals;
    for (const Complex root : roots) {
        if (root.imag() > 1e-9) {
            pairs.push_back({-2.0 * root.real(), std::norm(root), root});
        } else if (root.imag() >= -1e-9) {
            reals.push_back(root.real());
        }
    }
    std::sort(reals.begin(), reals.end());
    for (std::size_t i = 0; i + 1 < reals.size(); i += 2) {
        pairs.push_back({-(reals[i] + reals[i + 1]), reals[i] * reals[i + 1], Complex{reals[i], 0.0}});
    }
    return pairs;
}

Complex section_response(const Section& section, Complex z) {
    const Complex back = 1.0 / z;
    return (section.b0 + section.b1 * back + section.b2 * back * back) /
           (1.0 + section.a1 * back + section.a2 * back * back);
}

std::vector<Section> sections_of(const Prototype& prototype, double centre, double width) {
    const auto poles = paired(to_digital_band(prototype.poles, centre, width));
    auto zeros = paired(to_digital_band(prototype.zeros, centre, width));
    // Prototype zeros at infinity become one zero at 0 Hz and one at half the rate: z^2 - 1.
    while (zeros.size() < poles.size()) {
        zeros.push_back({0.0, -1.0, Complex{1.0, 0.0}});
    }
    const Complex at_centre = Complex{1.0, centre} / Complex{1.0, -centre};
    std::vector<Section> sections;
    for (const auto& pole : poles) {
        const auto nearest = std::min_element(zeros.begin(), zeros.end(), [&](const auto& a, const auto& b) {
            return std::abs(a.root - pole.root) < std::abs(b.root - pole.root);
        });
        Section section{1.0, nearest->c1, nearest->c2, pole.c1, pole.c2};
        zeros.erase(nearest);
        // Unit gain at the centre in every section keeps the states of all of them in the signal's own range.
        const double gain =
            (sections.empty() ? prototype.gain_at_zero : 1.0) / std::abs(section_response(section, at_centre));
        section.b0 *= gain;
        section.b1 *= gain;
        section.b2 *= gain;
        sections.push_back(
            {rounded(section.b0), rounded(section.b1), rounded(section.b2), rounded(section.a1), rounded(section.a2)});
    }
    return sections;
}

std::vector<double> minimum_phase_taps(const FilterSettings& settings, Hertz rate, const std::string& where) {
    const auto transition = static_cast<float>(settings.transition_hz / rate.value);
    const auto count = estimate_req_filter_len(transition, static_cast<float>(settings.stopband_db)) | 1U;
    if (count > 4001) {
        throw Refusal(where + ".transition_hz", "a band-pass of " + std::to_string(count) + " taps at this rate",
                      "at most 4001 taps: a wider transition");
    }
    std::vector<float> lowpass(count);
    const double half_width = (settings.high_hz - settings.low_hz) / 2.0;
    liquid_firdes_kaiser(count, static_cast<float>(half_width / rate.value), static_cast<float>(settings.stopband_db),
                         0.0F, lowpass.data());
    const double middle = (settings.high_hz + settings.low_hz) / 2.0;
    std::vector<double> bandpass;
    for (unsigned i = 0; i < count; ++i) {
        const double turns = middle / rate.value * (static_cast<double>(i) - (count - 1) / 2.0);
        bandpass.push_back(lowpass[i] * std::cos(2.0 * std::numbers::pi * turns));
    }
    auto taps = minimum_phase(bandpass);
    BandpassDesign unscaled{{}, taps};
    const double gain = std::abs(unscaled.response(band_centre(settings), rate));
    for (double& tap : taps) {
        tap = std::ldexp(std::nearbyint(std::ldexp(tap / gain, 30)), -30);
    }
    return taps;
}

std::vector<double> impulse_response(const BandpassDesign& design, std::size_t length) {
    if (design.sections.empty()) {
        return design.taps;
    }
    std::vector<double> response(length);
    response[0] = 1.0;
    for (const auto& section : design.sections) {
        double state1 = 0.0, state2 = 0.0;
        for (double& value : response) {
            const double out = section.b0 * value + state1;
            state1 = section.b1 * value - section.a1 * out + state2;
            state2 = section.b2 * value - section.a2 * out;
            value = out;
        }
    }
    return response;
}

} // namespace

Complex BandpassDesign::response(Hertz at, Hertz rate) const {
    const Complex z = std::polar(1.0, 2.0 * std::numbers::pi * at.value / rate.value);
    Complex product{1.0, 0.0};
    for (const auto& section : sections) {
        product *= section_response(section, z);
    }
    Complex sum{};
    Complex back{1.0, 0.0};
    for (const double tap : taps) {
        sum += tap * back;
        back /= z;
    }
    return taps.empty() ? product : sum;
}

double BandpassDesign::group_delay_samples(Hertz at, Hertz rate) const {
    const Complex back = std::polar(1.0, -2.0 * std::numbers::pi * at.value / rate.value);
    // The delay of a polynomial in z^-1 is the mean of its powers, weighted by its terms.
    const auto delay_of = [&](std::initializer_list<double> coefficients) {
        Complex sum{}, weighted{}, power{1.0, 0.0};
        double n = 0.0;
        for (const double coefficient : coefficients) {
            sum += coefficient * power;
            weighted += n * coefficient * power;
            power *= back;
            n += 1.0;
        }
        // A zero on the unit circle at this very frequency has no delay to speak of.
        return std::abs(sum) < 1e-12 ? 0.0 : (weighted / sum).real();
    };
    double delay = 0.0;
    for (const auto& s : sections) {
        delay += delay_of({s.b0, s.b1, s.b2}) - delay_of({1.0, s.a1, s.a2});
    }
    Complex sum{}, weighted{}, power{1.0, 0.0};
    for (std::size_t n = 0; n < taps.size(); ++n) {
        sum += taps[n] * power;
        weighted += static_cast<double>(n) * taps[n] * power;
        power *= back;
    }
    return taps.empty() ? delay : (weighted / sum).real();
}

std::size_t BandpassDesign::settle_samples() const {
    constexpr double energy_left = 1e-4;
    for (std::size_t length = 1024;; length *= 2) {
        const auto response = impulse_response(*this, length);
        double total = 0.0;
        for (const double value : response) {
            total += value * value;
        }
        double tail = 0.0;
        std::size_t settled = response.size();
        while (settled > 0 && tail + response[settled - 1] * response[settled - 1] < energy_left * total) {
            --settled;
            tail += response[settled] * response[settled];
        }
        // The response must have died out well within what was looked at; a hundred million samples is an hour at 30
        // kHz.
        if (settled < length / 2 || sections.empty() || length > 100'000'000) {
            return settled;
        }
    }
}

BandpassDesign design_bandpass(const FilterSettings& settings, Hertz rate, const std::string& where) {
    if (settings.low_hz >= settings.high_hz) {
        throw Refusal(where + ".low_hz", in_hertz(settings.low_hz), "less than high_hz");
    }
    if (settings.high_hz >= rate.value / 2.0) {
        throw Refusal(where + ".high_hz", in_hertz(settings.high_hz),
                      "less than half the rate, " + in_hertz(rate.value / 2.0));
    }
    if (settings.family == FilterFamily::elliptic && settings.passband_ripple_db >= settings.stopband_db) {
        throw Refusal(where + ".passband_ripple_db", std::to_string(settings.passband_ripple_db),
                      "less than stopband_db");
    }
    if (settings.family == FilterFamily::fir_minimum_phase) {
        return {{}, minimum_phase_taps(settings, rate, where)};
    }
    const auto warped = [&](double hz) { return rounded(std::tan(std::numbers::pi * hz / rate.value)); };
    const double low = warped(settings.low_hz), high = warped(settings.high_hz);
    return {sections_of(prototype_of(settings), std::sqrt(low * high), high - low), {}};
}

double quadrature_at(Hertz centre, Hertz rate) {
    const double warped = std::tan(std::numbers::pi * centre.value / rate.value);
    // Forty bits, as for the band-pass: the same on every processor.
    return std::ldexp(std::nearbyint(std::ldexp((warped - 1.0) / (warped + 1.0), 40)), -40);
}

Hertz band_centre(const FilterSettings& settings) noexcept {
    return Hertz{std::sqrt(settings.low_hz * settings.high_hz)};
}

} // namespace millpond
