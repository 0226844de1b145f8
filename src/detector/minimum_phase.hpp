// The filter of shortest delay that has the same magnitude response as a given one. Thread: control.
#pragma once

#include <vector>

namespace millpond {

/// Reflects the zeros of `taps` into the unit circle, through the real cepstrum (Oppenheim & Schafer's homomorphic
/// method). As many taps as it was given.
[[nodiscard]] std::vector<double> minimum_phase(const std::vector<double>& taps);

} // namespace millpond
