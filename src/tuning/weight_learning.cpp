#include "tuning/weight_learning.hpp"

#include "base/refusal.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <optional>
#include <set>

namespace millpond {
namespace {

using Matrix = Eigen::MatrixXd;
using Vector = Eigen::VectorXd;

// Chosen on invented recordings; a factor of three in any of them moves the hit rate by less than its interval.
constexpr int rounds = 6;
constexpr double block_ms = 50.0;      // of background that gives at most one example
constexpr double hardest_share = 0.02; // of the blocks
constexpr std::size_t fewest_hard = 60;
constexpr double early_ms = 12.0;        // a ripple's example is its best frame from here ...
constexpr double early_share = 0.4;      // ... to this share of its length: early counts
constexpr double penalty = 3e-3;         // on the weights of standardised features
constexpr double after_ripple_ms = 50.0; // no background

using Example = std::pair<std::size_t, std::size_t>; // track, frame of the track

class Learner {
  public:
    Learner(std::span<const FeatureTrack> tracks, std::size_t features, Hertz rate)
        : tracks_(tracks), n_(static_cast<Eigen::Index>(features)), rate_(rate), mean_(Vector::Zero(n_)),
          scale_(Vector::Ones(n_)), weights_(Vector::Zero(n_)) {
        weights_(0) = 1.0;
        for (const auto& track : tracks_) {
            background_.push_back(background_of(track));
        }
        standardise();
    }

    Vector learn() {
        std::set<Example> hard;
        for (int round = 0; round < rounds; ++round) {
            const auto ripples = best_of_ripples();
            add_hardest(hard);
            if (ripples.empty() || hard.empty()) {
                throw Refusal("recordings", "no ripples, or nothing else, in the training parts",
                              "both, to learn weights from");
            }
            fit(ripples, {hard.begin(), hard.end()});
        }
        Vector raw = weights_.cwiseQuotient(scale_);
        return raw / raw.cwiseAbs().maxCoeff();
    }

  private:
    [[nodiscard]] std::size_t frames_of(const FeatureTrack& track) const {
        return track.values.size() / static_cast<std::size_t>(n_);
    }
    [[nodiscard]] std::size_t in_track(double ms, const FeatureTrack& track) const {
        return static_cast<std::size_t>(frames_in_ms(ms, rate_)) / track.stride;
    }
    [[nodiscard]] Vector standard(const Example& example) const {
        const auto& track = tracks_[example.first];
        const float* values = track.values.data() + example.second * static_cast<std::size_t>(n_);
        Vector out(n_);
        for (Eigen::Index i = 0; i < n_; ++i) {
            out(i) = (static_cast<double>(values[i]) - mean_(i)) / scale_(i);
        }
        return out;
    }
    [[nodiscard]] bool known(const FeatureTrack& track, std::size_t frame) const {
        return std::isfinite(track.values[frame * static_cast<std::size_t>(n_)]);
    }

    [[nodiscard]] std::vector<bool> background_of(const FeatureTrack& track) const {
        std::vector<bool> background(frames_of(track), false);
        const auto mark = [&](std::uint64_t from, std::uint64_t to, bool value) {
            for (std::size_t i = from / track.stride; i < std::min<std::size_t>(to / track.stride, background.size());
                 ++i) {
                background[i] = value && known(track, i);
            }
        };
        for (const auto& interval : track.training) {
            mark(interval.from.value, interval.to.value, true);
        }
        for (const auto& ripple : track.recording->truth) {
            mark(ripple.onset.value, ripple.end.value + frames_in_ms(after_ripple_ms, rate_), false);
        }
        return background;
    }

    void standardise() {
        Vector sum = Vector::Zero(n_), squares = Vector::Zero(n_);
        double count = 0.0;
        for (std::size_t t = 0; t < tracks_.size(); ++t) {
            for (std::size_t i = 0; i < frames_of(tracks_[t]); i += 3) {
                if (known(tracks_[t], i)) {
                    const Vector values = standard({t, i});
                    sum += values;
                    squares += values.cwiseAbs2();
                    count += 1.0;
                }
            }
        }
        if (count == 0.0) {
            return;
        }
        mean_ = sum / count;
        scale_ = (squares / count - mean_.cwiseAbs2()).cwiseMax(1e-12).cwiseSqrt();
    }

    [[nodiscard]] double evidence(const Example& example) const { return weights_.dot(standard(example)); }

    [[nodiscard]] std::vector<Example> best_of_ripples() const {
        std::vector<Example> best;
        for (std::size_t t = 0; t < tracks_.size(); ++t) {
            for (const auto& ripple : tracks_[t].recording->truth) {
                if (const auto frame = best_frame(t, ripple)) {
                    best.push_back({t, *frame});
                }
            }
        }
        return best;
    }

    [[nodiscard]] std::optional<std::size_t> best_frame(std::size_t t, const Ripple& ripple) const {
        const auto& track = tracks_[t];
        const bool mine = std::any_of(track.training.begin(), track.training.end(), [&](const Interval& interval) {
            return interval.from <= ripple.onset && ripple.end < interval.to;
        });
        if (!mine) {
            return std::nullopt;
        }
        const auto onset = ripple.onset.value / track.stride;
        const auto length = (ripple.end - ripple.onset) / track.stride;
        const auto from = onset + in_track(early_ms, track);
        const auto to = std::max<std::uint64_t>(
            from + 1, onset + static_cast<std::uint64_t>(early_share * static_cast<double>(length)));
        std::optional<std::size_t> best;
        double most = -INFINITY;
        for (auto i = from; i < std::min<std::uint64_t>(to, frames_of(track)); ++i) {
            const double here = known(track, i) ? evidence({t, i}) : -INFINITY;
            if (here > most) {
                most = here;
                best = i;
            }
        }
        return best;
    }

    void add_hardest(std::set<Example>& hard) const {
        std::vector<std::pair<double, Example>> blocks;
        for (std::size_t t = 0; t < tracks_.size(); ++t) {
            const std::size_t length = std::max<std::size_t>(in_track(block_ms, tracks_[t]), 1);
            for (std::size_t from = 0; from < frames_of(tracks_[t]); from += length) {
                std::pair<double, Example> most{-INFINITY, {}};
                for (std::size_t i = from; i < std::min(from + length, frames_of(tracks_[t])); ++i) {
                    if (background_[t][i]) {
                        most = std::max(most, {evidence({t, i}), {t, i}});
                    }
                }
                if (std::isfinite(most.first)) {
                    blocks.push_back(most);
                }
            }
        }
        std::sort(blocks.begin(), blocks.end(), std::greater<>());
        const auto wanted =
            std::max(fewest_hard, static_cast<std::size_t>(hardest_share * static_cast<double>(blocks.size())));
        for (std::size_t i = 0; i < std::min(wanted, blocks.size()); ++i) {
            hard.insert(blocks[i].second);
        }
    }

    // Newton's method on the logistic loss, each class weighing one half in all.
    void fit(const std::vector<Example>& ripples, const std::vector<Example>& background) {
        const auto rows = static_cast<Eigen::Index>(ripples.size() + background.size());
        Matrix x(rows, n_ + 1);
        Vector sign(rows), weight(rows);
        Eigen::Index row = 0;
        const auto add = [&](const std::vector<Example>& examples, double value) {
            for (const auto& example : examples) {
                x.row(row).head(n_) = standard(example);
                x(row, n_) = 1.0;
                sign(row) = value;
                weight(row) = 1.0 / static_cast<double>(examples.size());
                ++row;
            }
        };
        add(ripples, 1.0);
        add(background, -1.0);
        Vector beta = Vector::Zero(n_ + 1);
        const Vector ridge = (Vector(n_ + 1) << Vector::Constant(n_, 2.0 * penalty), 1e-9).finished();
        for (int step = 0; step < 50; ++step) {
            const Vector margin = sign.cwiseProduct(x * beta);
            const Vector miss = (1.0 + margin.array().exp()).inverse().matrix();
            const Vector gradient =
                -x.transpose() * (weight.cwiseProduct(sign).cwiseProduct(miss)) + ridge.cwiseProduct(beta);
            const Vector curvature = weight.array() * miss.array() * (1.0 - miss.array());
            Matrix hessian = x.transpose() * curvature.asDiagonal() * x;
            hessian.diagonal() += ridge;
            const Vector change = hessian.ldlt().solve(gradient);
            beta -= change / std::max(1.0, change.norm() / 2.0); // no step longer than 2: far out the curve is flat
            if (change.norm() < 1e-9) {
                break;
            }
        }
        weights_ = beta.head(n_);
    }

    std::span<const FeatureTrack> tracks_;
    Eigen::Index n_;
    Hertz rate_;
    Vector mean_, scale_, weights_;
    std::vector<std::vector<bool>> background_;
};

} // namespace

std::vector<double> learn_weights(std::span<const FeatureTrack> tracks, std::size_t features, Hertz rate) {
    const Vector weights = Learner(tracks, features, rate).learn();
    return {weights.data(), weights.data() + weights.size()};
}

} // namespace millpond
