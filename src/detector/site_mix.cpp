#include "detector/site_mix.hpp"

#include "base/refusal.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::vector<double> mean_weights(const std::vector<ChannelRole>& inputs, ChannelRole role) {
    const auto count = std::count(inputs.begin(), inputs.end(), role);
    std::vector<double> weights(inputs.size(), 0.0);
    for (std::size_t i = 0; i < inputs.size(); ++i) {
        weights[i] = inputs[i] == role ? 1.0 / static_cast<double>(count) : 0.0;
    }
    return weights;
}

void require_length(const std::string& where, std::size_t found, std::size_t allowed, bool may_be_empty) {
    if (found != allowed && !(may_be_empty && found == 0)) {
        throw Refusal(where, std::to_string(found) + " numbers",
                      std::to_string(allowed) + (may_be_empty ? " or none" : "") +
                          ", as the channels of role ripple and reference ask for");
    }
}

} // namespace

SiteMixes SiteMixes::make(const EvidenceSettings& settings, std::vector<ChannelRole> inputs, const std::string& where) {
    SiteMixes mixes;
    const std::size_t n = inputs.size();
    require_length(where + ".background", settings.background.size(), n * (n + 1) / 2, true);
    mixes.inputs_ = std::move(inputs);
    mixes.background_ = settings.background;
    mixes.factor_.resize(n * n);
    mixes.solution_.resize(n);
    mixes.kept_.resize(n);
    for (const auto& [name, role] :
         {std::pair{sites_mix, ChannelRole::ripple}, {reference_mix, ChannelRole::reference}}) {
        mixes.mixes_.push_back({{std::string(name), mean_weights(mixes.inputs_, role), {}}, true});
    }
    for (std::size_t i = 0; i < settings.mixes.size(); ++i) {
        const auto& mix = settings.mixes[i];
        const auto place = where + ".mixes[" + std::to_string(i) + "]";
        if (mix.name.empty() || mixes.place_of(mix.name) < mixes.count()) {
            throw Refusal(place + ".name", "'" + mix.name + "'",
                          "a name that no other mix has, sites and reference among them");
        }
        require_length(place + ".weights", mix.weights.size(), n, false);
        require_length(place + ".pattern", mix.pattern.size(), n, true);
        mixes.mixes_.push_back({mix, false});
    }
    for (auto& mix : mixes.mixes_) {
        for (std::size_t a = 0; a < n && !mixes.background_.empty(); ++a) {
            for (std::size_t b = 0; b < n; ++b) {
                mix.power += mix.settings.weights[a] * mixes.covariance(a, b) * mix.settings.weights[b];
            }
        }
    }
    return mixes;
}

std::size_t SiteMixes::place_of(std::string_view name) const noexcept {
    const auto found =
        std::find_if(mixes_.begin(), mixes_.end(), [&](const auto& mix) { return mix.settings.name == name; });
    return static_cast<std::size_t>(found - mixes_.begin());
}

bool SiteMixes::takes_something(std::size_t mix) const noexcept {
    const auto& weights = mixes_[mix].settings.weights;
    return std::any_of(weights.begin(), weights.end(), [](double weight) { return weight != 0.0; });
}

double SiteMixes::covariance(std::size_t a, std::size_t b) const noexcept {
    const auto row = std::max(a, b);
    return background_[row * (row + 1) / 2 + std::min(a, b)];
}

void SiteMixes::weights(std::size_t mix, const std::vector<bool>& alive, double* out) noexcept {
    const auto& chosen = mixes_[mix];
    if (chosen.built_in) {
        mean_over_alive(chosen, alive, out);
        return;
    }
    const bool whole = std::find(alive.begin(), alive.end(), false) == alive.end();
    if (!whole && solve(chosen, alive, out)) {
        return;
    }
    for (std::size_t i = 0; i < inputs_.size(); ++i) {
        out[i] = alive[i] ? chosen.settings.weights[i] : 0.0;
    }
}

void SiteMixes::mean_over_alive(const Mix& mix, const std::vector<bool>& alive, double* out) const noexcept {
    double sum = 0.0;
    for (std::size_t i = 0; i < inputs_.size(); ++i) {
        out[i] = alive[i] ? mix.settings.weights[i] : 0.0;
        sum += out[i];
    }
    for (std::size_t i = 0; i < inputs_.size() && sum > 0.0; ++i) {
        out[i] /= sum;
    }
}

// Cholesky over the rows and columns that are left. False where there is nothing to solve with.
bool SiteMixes::solve(const Mix& mix, const std::vector<bool>& alive, double* out) noexcept {
    const std::size_t n = inputs_.size();
    kept_count_ = 0;
    for (std::size_t i = 0; i < n; ++i) {
        if (alive[i]) {
            kept_[kept_count_++] = i;
        }
    }
    if (background_.empty() || mix.settings.pattern.empty() || kept_count_ == 0) {
        return false;
    }
    for (std::size_t row = 0; row < kept_count_; ++row) {
        for (std::size_t column = 0; column <= row; ++column) {
            double value = covariance(kept_[row], kept_[column]);
            for (std::size_t k = 0; k < column; ++k) {
                value -= factor_[row * n + k] * factor_[column * n + k];
            }
            if (row == column && value <= 0.0) {
                return false;
            }
            factor_[row * n + column] = row == column ? std::sqrt(value) : value / factor_[column * n + column];
        }
    }
    for (std::size_t row = 0; row < kept_count_; ++row) {
        double value = mix.settings.pattern[kept_[row]];
        for (std::size_t k = 0; k < row; ++k) {
            value -= factor_[row * n + k] * solution_[k];
        }
        solution_[row] = value / factor_[row * n + row];
    }
    double power = 0.0; // of the background: a' inv(C) a, since w = inv(C) a
    for (std::size_t row = 0; row < kept_count_; ++row) {
        power += solution_[row] * solution_[row];
    }
    if (power <= 0.0) {
        return false;
    }
    for (std::size_t row = kept_count_; row-- > 0;) {
        for (std::size_t k = row + 1; k < kept_count_; ++k) {
            solution_[row] -= factor_[k * n + row] * solution_[k];
        }
        solution_[row] /= factor_[row * n + row];
    }
    std::fill(out, out + n, 0.0);
    for (std::size_t row = 0; row < kept_count_; ++row) {
        out[kept_[row]] = solution_[row] * std::sqrt(mix.power / power);
    }
    return true;
}

} // namespace millpond
