// Designs the causal band-pass: coefficients that are the same on every processor. Thread: control.
#pragma once

#include "base/units.hpp"
#include "detector/detector_settings.hpp"

#include <array>
#include <complex>
#include <vector>

namespace millpond {

/// One second-order section, a0 = 1: y = b0 x + b1 x' + b2 x'' - a1 y' - a2 y''.
struct Section {
    double b0, b1, b2, a1, a2;
};

/// Either sections (infinite response) or taps (finite response); the other list is empty.
struct BandpassDesign {
    std::vector<Section> sections;
    std::vector<double> taps;

    /// Gain and phase at `at`.
    [[nodiscard]] std::complex<double> response(Hertz at, Hertz rate) const;
    /// Group delay in samples at `at`, from the exact derivative of the phase.
    [[nodiscard]] double group_delay_samples(Hertz at, Hertz rate) const;
    /// Samples until less than a ten-thousandth of the impulse response's energy is left.
    [[nodiscard]] std::size_t settle_samples() const;
};

/// Prototype by liquid-dsp, band transform and bilinear transform (edges prewarped) in double precision.
/// Refuses edges out of order or at half the rate and above, `where` naming the settings for the message.
[[nodiscard]] BandpassDesign design_bandpass(const FilterSettings& settings, Hertz rate, const std::string& where);

/// Coefficient of the first-order all-pass that turns by 90 degrees at `centre`.
[[nodiscard]] double quadrature_at(Hertz centre, Hertz rate);

/// Centre of the band on a logarithmic axis, where delays are stated.
[[nodiscard]] Hertz band_centre(const FilterSettings& settings) noexcept;

} // namespace millpond
