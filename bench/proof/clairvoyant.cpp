#include "proof/clairvoyant.hpp"

#include "support/bench.hpp"

#include <algorithm>
#include <cmath>

namespace millpond::bench {
namespace {

constexpr Eigen::Index order = 25;
constexpr std::size_t most_frames = 150000; // of the background: two minutes tell it well enough
constexpr double bandwidth_hz = 100.0;
constexpr double far_out = 5.0;     // deviations in which a frame is no longer taken for background
constexpr double lead_in_ms = 20.0; // before the onset: what of a ripple lies below a tenth of its peak

Eigen::MatrixXd matrix_of(std::span<const float> frames, Eigen::Index channels, std::size_t from, std::size_t to) {
    const auto rows = static_cast<Eigen::Index>(to - from);
    Eigen::MatrixXd x(rows, channels);
    for (Eigen::Index t = 0; t < rows; ++t) {
        for (Eigen::Index c = 0; c < channels; ++c) {
            x(t, c) =
                static_cast<double>(frames[(from + static_cast<std::size_t>(t)) * static_cast<std::size_t>(channels) +
                                           static_cast<std::size_t>(c)]);
        }
    }
    return x;
}

// The last `order` frames before each frame from `order` on, side by side.
Eigen::MatrixXd pasts(const Eigen::MatrixXd& x) {
    const Eigen::Index rows = x.rows() - order, c = x.cols();
    Eigen::MatrixXd z(rows, order * c);
    for (Eigen::Index k = 0; k < order; ++k) {
        z.middleCols(k * c, c) = x.middleRows(order - k - 1, rows);
    }
    return z;
}

double threshold_energy(double false_per_minute) noexcept {
    return 2.0 * std::log(bandwidth_hz / (false_per_minute / 60.0));
}

} // namespace

Whitener::Whitener(std::span<const float> frames, std::size_t channels)
    : channels_(static_cast<Eigen::Index>(channels)) {
    Eigen::MatrixXd x = matrix_of(frames, channels_, 0, std::min(frames.size() / channels, most_frames));
    x.rowwise() -= x.colwise().mean().eval();
    std::vector<bool> taken(static_cast<std::size_t>(x.rows() - order), true);
    fit(x, taken);
    for (int round = 0; round < 2; ++round) { // the outliers hide each other at first
        const Eigen::MatrixXd white = root_.triangularView<Eigen::Lower>().solve(residual(x).transpose());
        const double most = far_out * far_out * static_cast<double>(channels_);
        for (Eigen::Index t = 0; t < white.cols(); ++t) {
            taken[static_cast<std::size_t>(t)] = white.col(t).squaredNorm() <= most;
        }
        fit(x, taken);
    }
    left_out_ = static_cast<double>(std::count(taken.begin(), taken.end(), false)) / static_cast<double>(taken.size());
}

void Whitener::fit(const Eigen::MatrixXd& x, const std::vector<bool>& taken) {
    constexpr Eigen::Index rows_at_a_time = 8192;
    const Eigen::Index n = order * channels_;
    Eigen::MatrixXd within = Eigen::MatrixXd::Zero(n, n), across = Eigen::MatrixXd::Zero(n, channels_);
    for (Eigen::Index from = 0; from + order < x.rows(); from += rows_at_a_time) {
        const Eigen::Index rows = std::min(rows_at_a_time, x.rows() - order - from);
        Eigen::MatrixXd z = pasts(x.middleRows(from, rows + order));
        Eigen::MatrixXd y = x.middleRows(from + order, rows);
        for (Eigen::Index t = 0; t < rows; ++t) {
            if (!taken[static_cast<std::size_t>(from + t)]) {
                z.row(t).setZero();
                y.row(t).setZero();
            }
        }
        within.selfadjointView<Eigen::Lower>().rankUpdate(z.transpose());
        across.noalias() += z.transpose() * y;
    }
    within = within.selfadjointView<Eigen::Lower>();
    within.diagonal().array() += 1e-9 * within.trace() / static_cast<double>(n);
    prediction_ = within.ldlt().solve(across);
    Eigen::MatrixXd off = residual(x);
    double count = 0.0;
    for (Eigen::Index t = 0; t < off.rows(); ++t) {
        if (taken[static_cast<std::size_t>(t)]) {
            count += 1.0;
        } else {
            off.row(t).setZero();
        }
    }
    root_ = (off.transpose() * off / count).llt().matrixL();
}

Eigen::MatrixXd Whitener::residual(const Eigen::MatrixXd& x) const {
    Eigen::MatrixXd off = x.bottomRows(x.rows() - order);
    for (Eigen::Index k = 0; k < order; ++k) {
        off.noalias() -= x.middleRows(order - k - 1, off.rows()) * prediction_.middleRows(k * channels_, channels_);
    }
    return off;
}

std::vector<double> Whitener::running_energy(std::span<const float> frames, std::size_t from, std::size_t to) const {
    const auto past = static_cast<std::size_t>(order);
    const Eigen::MatrixXd white =
        root_.triangularView<Eigen::Lower>().solve(residual(matrix_of(frames, channels_, from - past, to)).transpose());
    std::vector<double> energy;
    double sum = 0.0;
    for (Eigen::Index t = 0; t < white.cols(); ++t) {
        sum += white.col(t).squaredNorm();
        energy.push_back(sum);
    }
    return energy;
}

Counts clairvoyant_counts(const ProofRecording& recording, const Whitener& whitener, double false_per_minute,
                          double scale) {
    Counts counts;
    counts.minutes = static_cast<double>(recording.frames()) / recording.rate.value / 60.0;
    counts.false_detections = false_per_minute * counts.minutes;
    const double needed = threshold_energy(false_per_minute) / (scale * scale);
    const auto lead_in = frames_in_ms(lead_in_ms, recording.rate);
    for (const auto& ripple : recording.truth) {
        const auto from = static_cast<std::size_t>(ripple.onset.value - lead_in);
        const auto energy = whitener.running_energy(recording.ripples, from, ripple.end.value + 1);
        counts.ripples += 1.0;
        const auto reached = std::lower_bound(energy.begin(), energy.end(), needed);
        if (reached != energy.end()) {
            const auto at = from + static_cast<std::size_t>(reached - energy.begin());
            counts.add_hit(at > ripple.onset.value ? at - ripple.onset.value : 0, ripple.end - ripple.onset);
        }
    }
    return counts;
}

void check_whitener() {
    constexpr double sd = 20.0;
    constexpr std::size_t channels = 2, frames = 60;
    const Whitener whitener(noise(200000 * channels, sd), channels);
    std::vector<float> wave(frames * channels, 0.0F);
    double energy = 0.0;
    for (std::size_t i = wave.size() / 2; i < wave.size(); ++i) {
        wave[i] = static_cast<float>(60.0 * std::cos(1.1 * static_cast<double>(i)));
        energy += static_cast<double>(wave[i]) * static_cast<double>(wave[i]) / (sd * sd);
    }
    const double found = whitener.running_energy(wave, order, frames).back();
    if (std::abs(found / energy - 1.0) > 0.05) {
        throw std::runtime_error("whitened energy " + std::to_string(found) + ", plain sum " + std::to_string(energy));
    }
}

namespace {

using WhitenerOf = std::function<Whitener(const ProofRecording&)>;

Curve floor_with(const std::vector<ProofRecording>& recordings, std::span<const double> false_per_minute,
                 const WhitenerOf& whitener_of) {
    Curve curve;
    for (const double rate : false_per_minute) {
        curve.push_back({std::sqrt(threshold_energy(rate)), std::vector<Counts>(recordings.size())});
    }
    in_parallel(recordings.size(), [&](std::size_t i) {
        const auto whitener = whitener_of(recordings[i]);
        for (std::size_t k = 0; k < curve.size(); ++k) {
            curve[k].by_recording[i] = clairvoyant_counts(recordings[i], whitener, false_per_minute[k], 1.0);
        }
    });
    return curve;
}

} // namespace

Curve clairvoyant_floor(const std::vector<ProofRecording>& recordings, std::span<const double> false_per_minute) {
    return floor_with(recordings, false_per_minute, [](const ProofRecording& recording) {
        return Whitener(recording.background, recording.channels.size());
    });
}

Curve clairvoyant_floor(const std::vector<ProofRecording>& recordings, const Whitener& whitener,
                        std::span<const double> false_per_minute) {
    return floor_with(recordings, false_per_minute, [&](const ProofRecording&) { return whitener; });
}

} // namespace millpond::bench
