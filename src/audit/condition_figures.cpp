#include "audit/condition_figures.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace millpond {
namespace {

struct Unit {
    Condition condition;
    SampleIndex from, to;
};

std::vector<Unit> units_of(std::span<const Event> events, std::span<const Condition> list, SampleIndex end) {
    std::vector<Unit> units;
    for (const auto& event : events) {
        if (event.kind != EventKind::trial) {
            continue;
        }
        const auto trial = event.as<TrialDetail>();
        if (!units.empty()) {
            units.back().to = event.sample;
        }
        if (trial.listed != 0 && trial.number >= 1 && trial.number <= list.size()) {
            units.push_back({list[trial.number - 1], event.sample, end});
        } else {
            break; // beyond the list: no condition
        }
    }
    if (units.empty() && list.size() == 1) {
        units.push_back({list.front(), SampleIndex{}, end});
    }
    return units;
}

ConditionFigures& figures_for(std::vector<ConditionFigures>& all, Condition condition) {
    const auto found =
        std::find_if(all.begin(), all.end(), [condition](const auto& each) { return each.condition == condition; });
    if (found != all.end()) {
        return *found;
    }
    all.emplace_back().condition = condition;
    return all.back();
}

void count(ConditionFigures& figures, std::span<const Event> events, const Unit& unit, const Intervals& eligible,
           Hertz rate) {
    SampleIndex last_trigger{UINT64_MAX};
    for (const auto& event : events) {
        if (event.sample < unit.from || event.sample >= unit.to) {
            continue;
        }
        switch (event.kind) {
        case EventKind::detection:
            figures.detections += contains(eligible, event.sample) ? 1 : 0;
            break;
        case EventKind::trigger:
            ++figures.triggers;
            figures.catch_trials += event.as<TriggerDetail>().caught;
            if (last_trigger != SampleIndex{UINT64_MAX}) {
                figures.trigger_intervals_s.push_back(seconds_at(SampleIndex{event.sample - last_trigger}, rate));
            }
            last_trigger = event.sample;
            break;
        case EventKind::order:
            ++figures.orders;
            break;
        case EventKind::pulse:
            ++figures.pulses;
            break;
        default:
            break;
        }
    }
}

double per_minute(std::uint64_t count, double minutes) {
    return minutes > 0.0 ? static_cast<double>(count) / minutes : std::numeric_limits<double>::quiet_NaN();
}

} // namespace

double ConditionFigures::detections_per_minute() const noexcept {
    return per_minute(detections, eligible_minutes);
}

double ConditionFigures::triggers_per_minute() const noexcept {
    return per_minute(triggers, eligible_minutes);
}

std::vector<ConditionFigures> condition_figures(std::span<const Event> events, std::span<const Condition> list,
                                                const Intervals& eligible, Hertz rate, SampleIndex end) {
    std::vector<ConditionFigures> all;
    for (const auto& unit : units_of(events, list, end)) {
        auto& figures = figures_for(all, unit.condition);
        ++figures.units;
        figures.minutes += seconds_at(SampleIndex{unit.to - unit.from}, rate) / 60.0;
        const auto inside = intersection(eligible, {{unit.from, unit.to}});
        figures.eligible_minutes += seconds_at(SampleIndex{frames_in(inside)}, rate) / 60.0;
        count(figures, events, unit, inside, rate);
    }
    for (auto& figures : all) {
        std::sort(figures.trigger_intervals_s.begin(), figures.trigger_intervals_s.end());
    }
    return all;
}

double same_rate_p(std::uint64_t one, double one_minutes, std::uint64_t other, double other_minutes) {
    const std::uint64_t sum = one + other;
    const double share = one_minutes / (one_minutes + other_minutes);
    const auto log_chance = [&](std::uint64_t k) {
        const auto n = static_cast<double>(sum), x = static_cast<double>(k);
        return std::lgamma(n + 1.0) - std::lgamma(x + 1.0) - std::lgamma(n - x + 1.0) + x * std::log(share) +
               (n - x) * std::log1p(-share);
    };
    const double observed = log_chance(one);
    double p = 0.0;
    for (std::uint64_t k = 0; k <= sum; ++k) {
        const double chance = log_chance(k);
        p += chance <= observed + 1e-7 ? std::exp(chance) : 0.0; // the small step: equally likely ones count too
    }
    return std::min(p, 1.0);
}

std::vector<RateComparison> compare_rates(std::span<const ConditionFigures> figures) {
    std::vector<RateComparison> compared;
    for (std::size_t i = 0; i < figures.size(); ++i) {
        for (std::size_t j = i + 1; j < figures.size(); ++j) {
            const auto &one = figures[i], &other = figures[j];
            if (one.eligible_minutes > 0.0 && other.eligible_minutes > 0.0) {
                compared.push_back(
                    {one.condition, other.condition, one.detections_per_minute() / other.detections_per_minute(),
                     same_rate_p(one.detections, one.eligible_minutes, other.detections, other.eligible_minutes)});
            }
        }
    }
    return compared;
}

} // namespace millpond
