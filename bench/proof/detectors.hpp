// The detectors under proof: the textbook chain at its best settings, two bands against each other, ours. All of them
// are the engine's own, run in condition none: scored as detectors to which no pulses are given. Thread: cold; the
// calls use all processors.
#pragma once

#include "proof/figures.hpp"
#include "tuning/learning.hpp"

#include <array>

namespace millpond::bench {

inline constexpr std::array<double, 3> asked_false_per_minute{0.3, 1.0, 3.0};

enum class Grid : std::uint8_t {
    full,
    coarse ///< for a quick look
};

/// Frames that are judged: all, or those outside the blocks that learn_ours_in_blocks looks at.
struct Judged {
    double block_s = 0.0; ///< 0: all
};

/// The textbook chain's settings with the most hits at one false rate, without their threshold.
struct BestTextbook {
    DetectorSettings settings;
    double found = 0.0, latency_ms = 0.0; ///< on the recordings that they were chosen on
    [[nodiscard]] std::string name() const;
};

struct TextbookChoice {
    std::array<BestTextbook, 3> best; ///< at each of asked_false_per_minute
    BestTextbook quick;               ///< the quickest at 1 a minute within three points of the best there
    std::size_t tried = 0;            ///< settings without their thresholds
};

/// Bands, orders, rectified or analytic, smoothing, votes, veto or none.
[[nodiscard]] TextbookChoice choose_textbook(const std::vector<ProofRecording>& training, Grid grid);

/// The envelope detector as settings have it, before anything is chosen.
[[nodiscard]] DetectorSettings textbook_chain();

/// Over thresholds, in the place of its own.
[[nodiscard]] Curve curve_of(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings,
                             const Judged& judged = {});

/// As it stands: its own threshold.
[[nodiscard]] CurvePoint run_as_is(const DetectorSettings& settings, const std::vector<ProofRecording>& recordings);

/// Envelope of 150-250 Hz less `factor` times that of 320-560 Hz, on the mean of envelopes of the sites' mean.
[[nodiscard]] DetectorSettings two_bands(double factor, double smoothing_ms);
/// The best of a few smoothings on `training` at 1 a minute.
[[nodiscard]] DetectorSettings choose_two_bands(const std::vector<ProofRecording>& training);

/// Method evidence as it comes, nothing learned.
[[nodiscard]] DetectorSettings unlearned();

/// Learned from recordings, all of them for training; asked for 1 false a minute.
[[nodiscard]] Learned learn_ours(const std::vector<ProofRecording>& training,
                                 const std::vector<FeatureSettings>& features);
/// Learned from the blocks 1, 3, ... of `block_s` alone.
[[nodiscard]] Learned learn_ours_in_blocks(const std::vector<ProofRecording>& training,
                                           const std::vector<FeatureSettings>& features, double block_s);
/// What the detector finds, by its own threshold.
[[nodiscard]] std::vector<SampleIndex> detections_of(const DetectorSettings& settings, const ProofRecording& recording);
[[nodiscard]] DetectorSettings with_threshold(DetectorSettings settings, double deviations);

} // namespace millpond::bench
