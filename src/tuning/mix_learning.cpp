#include "tuning/mix_learning.hpp"

#include "base/refusal.hpp"
#include "detector/section_cascade.hpp"

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

using Matrix = Eigen::MatrixXd;
using Vector = Eigen::VectorXd;

constexpr double near_ripple_ms = 50.0; // neither ripple nor background
constexpr double most_energy = 50.0;    // times the median's: what an artefact weighs at most

std::vector<std::size_t> looked_at(const Channels& channels) {
    std::vector<std::size_t> places;
    for (std::size_t i = 0; i < channels.size(); ++i) {
        if (channels[i].role != ChannelRole::unused) {
            places.push_back(i);
        }
    }
    return places;
}

enum class Side : std::uint8_t {
    neither,
    background,
    ripple
};

std::vector<Side> sides_of(const TuningRecording& recording, const Intervals& training, Hertz rate) {
    std::vector<Side> sides(recording.frames(), Side::neither);
    for (const auto& interval : training) {
        std::fill(sides.begin() + static_cast<std::ptrdiff_t>(interval.from.value),
                  sides.begin() + static_cast<std::ptrdiff_t>(interval.to.value), Side::background);
    }
    const auto in_training = sides;
    const auto margin = frames_in_ms(near_ripple_ms, rate);
    const auto at = [&](std::uint64_t frame) {
        return sides.begin() + static_cast<std::ptrdiff_t>(std::min<std::uint64_t>(frame, sides.size()));
    };
    for (const auto& ripple : recording.truth) {
        const auto onset = ripple.onset.value;
        std::fill(at(onset - std::min(onset, margin)), at(ripple.end.value + margin + 1), Side::neither);
    }
    for (const auto& ripple : recording.truth) {
        for (auto frame = ripple.onset.value; frame <= std::min<std::uint64_t>(ripple.end.value, sides.size() - 1);
             ++frame) {
            sides[frame] = in_training[frame] == Side::background ? Side::ripple : sides[frame];
        }
    }
    return sides;
}

/// Sums of outer products inside and outside ripples.
struct Covariances {
    Matrix ripple, background;
    std::uint64_t ripple_frames = 0, background_frames = 0;

    explicit Covariances(Eigen::Index n) : ripple(Matrix::Zero(n, n)), background(Matrix::Zero(n, n)) {}
};

double median_energy(const Matrix& band, const std::vector<Side>& sides) {
    std::vector<double> energies;
    for (Eigen::Index i = 0; i < band.cols(); i += 7) {
        if (sides[static_cast<std::size_t>(i)] == Side::background) {
            energies.push_back(band.col(i).squaredNorm());
        }
    }
    if (energies.empty()) {
        return 0.0;
    }
    std::nth_element(energies.begin(), energies.begin() + static_cast<std::ptrdiff_t>(energies.size() / 2),
                     energies.end());
    return energies[energies.size() / 2];
}

Matrix band_of(const TuningRecording& recording, const std::vector<std::size_t>& places, Hertz rate,
               std::vector<Side>& sides) {
    const auto design = design_bandpass(FilterSettings{}, rate, "learning");
    Matrix band(static_cast<Eigen::Index>(places.size()), static_cast<Eigen::Index>(recording.frames()));
    const std::size_t settle = design.settle_samples();
    for (std::size_t c = 0; c < places.size(); ++c) {
        SectionCascade filter(design.sections);
        std::size_t unsettled = settle;
        for (std::size_t i = 0; i < recording.frames(); ++i) {
            const double value = static_cast<double>(recording.data[i * recording.channels.size() + places[c]]);
            if (!std::isfinite(value)) {
                filter.clear();
                unsettled = settle;
            }
            band(static_cast<Eigen::Index>(c), static_cast<Eigen::Index>(i)) =
                std::isfinite(value) ? filter.next(value) : 0.0;
            if (unsettled > 0) {
                --unsettled;
                sides[i] = Side::neither;
            }
        }
    }
    return band;
}

void add(Covariances& sums, const Matrix& band, const std::vector<Side>& sides) {
    const double limit = most_energy * median_energy(band, sides);
    for (Eigen::Index i = 0; i < band.cols(); ++i) {
        const auto side = sides[static_cast<std::size_t>(i)];
        if (side == Side::neither) {
            continue;
        }
        const double energy = band.col(i).squaredNorm();
        const double weight = energy > limit ? limit / energy : 1.0;
        auto& sum = side == Side::ripple ? sums.ripple : sums.background;
        sum.selfadjointView<Eigen::Lower>().rankUpdate(band.col(i), weight);
        ++(side == Side::ripple ? sums.ripple_frames : sums.background_frames);
    }
}

double gain_of(const Vector& weights, const Matrix& ripple, const Matrix& background) {
    return weights.dot(ripple * weights) / weights.dot(background * weights);
}

std::vector<double> list_of(const Vector& values) {
    return {values.data(), values.data() + values.size()};
}

} // namespace

LearnedMix learn_mix(std::span<const TuningRecording> recordings, std::span<const Intervals> training, Hertz rate,
                     double shrinkage) {
    const auto& channels = recordings.front().channels;
    const auto places = looked_at(channels);
    const auto n = static_cast<Eigen::Index>(places.size());
    Covariances sums(n);
    for (std::size_t r = 0; r < recordings.size(); ++r) {
        if (recordings[r].channels != channels) {
            throw Refusal("recording " + std::to_string(r + 1), "other channels or roles than the first recording's",
                          "the same in all that a mix is learned from");
        }
        auto sides = sides_of(recordings[r], training[r], rate);
        const auto band = band_of(recordings[r], places, rate, sides);
        add(sums, band, sides);
    }
    if (sums.ripple_frames == 0 || sums.background_frames == 0) {
        throw Refusal("recordings", "no ripples, or nothing else, in the training parts", "both, to learn a mix from");
    }
    const Matrix ripple = Matrix(sums.ripple.selfadjointView<Eigen::Lower>()) / static_cast<double>(sums.ripple_frames);
    Matrix background =
        Matrix(sums.background.selfadjointView<Eigen::Lower>()) / static_cast<double>(sums.background_frames);
    const double equal = background.trace() / static_cast<double>(n);
    background = (1.0 - shrinkage) * background + shrinkage * equal * Matrix::Identity(n, n);
    const Eigen::GeneralizedSelfAdjointEigenSolver<Matrix> solver(ripple, background);
    // Eigenvalues rise: the last vector is the one in which ripples stand out most; its background power is 1.
    Vector weights = solver.eigenvectors().col(n - 1);
    Vector pattern = background * weights;
    Eigen::Index strongest = 0;
    pattern.cwiseAbs().maxCoeff(&strongest);
    if (pattern(strongest) < 0.0) {
        weights = -weights;
        pattern = -pattern;
    }
    Vector mean = Vector::Zero(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        mean(i) = channels[places[static_cast<std::size_t>(i)]].role == ChannelRole::ripple ? 1.0 : 0.0;
    }
    // In uV of the mean's background, so that features of both kinds of mix have one scale.
    weights *= std::sqrt(mean.dot(background * mean)) / mean.sum();
    LearnedMix learned;
    learned.weights = list_of(weights);
    learned.pattern = list_of(pattern);
    for (Eigen::Index row = 0; row < n; ++row) {
        for (Eigen::Index column = 0; column <= row; ++column) {
            learned.background.push_back(background(row, column));
        }
    }
    learned.gain = gain_of(weights, ripple, background);
    learned.mean_gain = gain_of(mean, ripple, background);
    return learned;
}

} // namespace millpond
