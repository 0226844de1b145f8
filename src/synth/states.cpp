#include "synth/states.hpp"

#include <algorithm>
#include <limits>

namespace millpond {
namespace {

constexpr double shortest_s = 0.1;

/// Log-normal, of the mean asked for.
double length_s(Random& random, double mean_s, double log_sd) {
    const double log_mean = portable_log(mean_s) - 0.5 * log_sd * log_sd;
    return std::max(shortest_s, portable_exp(log_mean + log_sd * random.normal_within(2.5)));
}

} // namespace

States::States(const SceneSettings& settings) : change_s_(settings.states.change_s) {
    const auto& states = settings.states;
    if (states.run_s == 0.0) {
        return;
    }
    if (states.rest_s == 0.0) {
        epochs_.push_back({0.0, std::numeric_limits<double>::max(), AnimalState::run});
        return;
    }
    Random random(settings.seed, number_of(RandomStream::states));
    auto state = states.first;
    for (double at_s = 0.0; at_s <= settings.duration_s;) {
        const double mean_s = state == AnimalState::rest ? states.rest_s : states.run_s;
        const double end_s = at_s + length_s(random, mean_s, states.length_log_sd);
        epochs_.push_back({at_s, end_s, state});
        state = state == AnimalState::rest ? AnimalState::run : AnimalState::rest;
        at_s = end_s;
    }
    epochs_.back().end_s = std::numeric_limits<double>::max();
}

const States::Epoch& States::epoch_at(double t) const noexcept {
    const auto after = std::upper_bound(epochs_.begin(), epochs_.end(), t,
                                        [](double at, const Epoch& epoch) { return at < epoch.onset_s; });
    return *std::prev(after);
}

bool States::runs_at(double t) const noexcept {
    return change() && epoch_at(t).state == AnimalState::run;
}

double States::running_at(double t) const noexcept {
    const auto& epoch = epoch_at(t);
    const double changed = epoch.onset_s == 0.0 ? 1.0 : std::min(1.0, (t - epoch.onset_s) / change_s_);
    return epoch.state == AnimalState::run ? changed : 1.0 - changed;
}

double States::theta_at(double t) const noexcept {
    return change() ? running_at(t) : 1.0;
}

double States::delta_at(double t) const noexcept {
    return change() ? 1.0 - running_at(t) : 1.0;
}

std::vector<Happening> States::happenings() const {
    std::vector<Happening> all;
    for (const auto& epoch : epochs_) {
        all.push_back(
            {epoch.onset_s, epoch.end_s, epoch.state == AnimalState::run ? HappeningKind::run : HappeningKind::rest});
    }
    return all;
}

} // namespace millpond
