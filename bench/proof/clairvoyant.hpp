// The clairvoyant floor: how early, and of how many ripples, a detector could know that had been told the waveform of
// each ripple on every channel, but not when it comes. Thread: one.
//
// The background is made white by a vector autoregressive model of it (least squares). Of a known waveform at an
// unknown time, at a false rate R, the matched score must reach eta, eta^2 = 2 ln(B / R) with B = 100 Hz of bandwidth:
// the floor is when the running energy of the whitened ripple reaches eta^2 (matched-filter theory). It holds for a
// Gaussian background whose law does not change: frames far outside that law (steps, spikes, muscle), which a detector
// might know as such, are left out of the model.
#pragma once

#include "proof/figures.hpp"

#include <Eigen/Dense>

namespace millpond::bench {

class Whitener {
  public:
    /// `frames`: the background, `channels` values a frame.
    Whitener(std::span<const float> frames, std::size_t channels);

    /// Running energy of the whitened waveform: one value for each of `frames`' frames from `from` up to `to`.
    [[nodiscard]] std::vector<double> running_energy(std::span<const float> frames, std::size_t from,
                                                     std::size_t to) const;
    /// Share of the background's frames that the model left out.
    [[nodiscard]] double left_out() const noexcept { return left_out_; }

  private:
    [[nodiscard]] Eigen::MatrixXd residual(const Eigen::MatrixXd& x) const;
    void fit(const Eigen::MatrixXd& x, const std::vector<bool>& taken);

    Eigen::Index channels_;
    Eigen::MatrixXd prediction_; ///< [order * channels][channels]
    Eigen::MatrixXd root_;       ///< lower Cholesky factor of the residual's covariance
    double left_out_ = 0.0;
};

/// Throws where a waveform in white noise, whose energy anyone can add up, does not come out right.
void check_whitener();

/// The floor at each of `false_per_minute`, as a curve whose thresholds are eta. Recordings split in parts.
[[nodiscard]] Curve clairvoyant_floor(const std::vector<ProofRecording>& recordings,
                                      std::span<const double> false_per_minute);

/// The same of recordings whose background one whitener knows.
[[nodiscard]] Curve clairvoyant_floor(const std::vector<ProofRecording>& recordings, const Whitener& whitener,
                                      std::span<const double> false_per_minute);

/// One recording, its ripples `scale` times as large;
[[nodiscard]] Counts clairvoyant_counts(const ProofRecording& recording, const Whitener& whitener,
                                        double false_per_minute, double scale);

} // namespace millpond::bench
