#include "audit/control_figures.hpp"

#include "sham/schedule_report.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <set>
#include <utility>

namespace millpond {
namespace {

using MomentKey = std::pair<PulseOrigin, std::uint32_t>;

bool is_of_a_plan(PulseOrigin origin) {
    return origin != PulseOrigin::trigger;
}

std::set<MomentKey> ordered_ones(std::span<const Event> events) {
    std::set<MomentKey> ordered;
    for (const auto& event : events) {
        if (event.kind == EventKind::order) {
            const auto detail = event.as<TriggerDetail>();
            ordered.insert({detail.origin, detail.number});
        }
    }
    return ordered;
}

std::vector<Moment> moments_in(std::span<const Event> events) {
    const auto ordered = ordered_ones(events);
    std::vector<Moment> moments;
    for (const auto& event : events) {
        if (event.kind != EventKind::slot && event.kind != EventKind::omitted) {
            continue;
        }
        const auto detail = event.as<TriggerDetail>();
        Moment moment{detail.origin, detail.number, SampleIndex{detail.from}, event.sample, MomentFate::omitted};
        if (event.kind == EventKind::omitted) {
            moment.rule = static_cast<Rule>(event.code);
        } else if (ordered.count({detail.origin, detail.number}) > 0) {
            moment.fate = MomentFate::given;
        } else {
            moment.fate = detail.caught != 0 ? MomentFate::catch_trial : MomentFate::phantom;
        }
        moments.push_back(moment);
    }
    return moments;
}

// Places that the session never came to. The journal's own places must be those of the file, else it is another one.
void add_not_reached(ControlFigures& figures, const Schedule& schedule) {
    std::size_t reached = 0;
    for (const auto& moment : figures.moments) {
        if (moment.origin != PulseOrigin::schedule) {
            continue;
        }
        if (moment.number == 0 || moment.number > schedule.size() || schedule[moment.number - 1] != moment.from) {
            figures.about_schedule = fmt::format("its file has been changed since: place {} was at sample {}",
                                                 moment.number, moment.from.value);
            return;
        }
        reached = std::max<std::size_t>(reached, moment.number);
    }
    figures.scheduled.planned = schedule.size();
    figures.scheduled.not_reached = schedule.size() - reached;
    for (std::size_t i = reached; i < schedule.size(); ++i) {
        figures.moments.push_back({PulseOrigin::schedule, static_cast<std::uint32_t>(i + 1), schedule[i], schedule[i],
                                   MomentFate::not_reached});
    }
}

void look_for_ripples(std::vector<Moment>& moments, const KnownRipples& known, Hertz rate) {
    for (auto& moment : moments) {
        if (moment.fate != MomentFate::not_reached && !contains(known.unknown, moment.at)) {
            moment.in_ripple = inside(known.ripples, moment.at, frames_in_ms(known.early_ms, rate));
        }
    }
}

bool kept(const Moment& moment) {
    return moment.fate == MomentFate::given || moment.fate == MomentFate::phantom ||
           moment.fate == MomentFate::catch_trial;
}

Proportion in_ripples(const std::vector<Moment>& moments, PulseOrigin origin, MomentFate fate) {
    std::uint64_t in = 0, of = 0;
    for (const auto& moment : moments) {
        if (moment.origin == origin && moment.fate == fate && moment.in_ripple) {
            ++of;
            in += *moment.in_ripple ? 1 : 0;
        }
    }
    return proportion(in, of);
}

void count(MomentFigures& figures, const Moment& moment) {
    ++figures.came;
    figures.given += moment.fate == MomentFate::given ? 1 : 0;
    figures.phantoms += moment.fate == MomentFate::phantom ? 1 : 0;
    figures.catch_trials += moment.fate == MomentFate::catch_trial ? 1 : 0;
    if (moment.fate == MomentFate::omitted) {
        ++figures.omitted;
        figures.omitted_by.at(static_cast<std::size_t>(moment.rule) % rule_count) += 1;
    }
}

void add_figures(MomentFigures& figures, const std::vector<Moment>& moments, PulseOrigin origin, Hertz rate) {
    Schedule planned, came;
    std::vector<double> later_ms;
    for (const auto& moment : moments) {
        if (moment.origin != origin || moment.fate == MomentFate::not_reached) {
            continue;
        }
        count(figures, moment);
        planned.push_back(moment.from);
        if (kept(moment)) {
            came.push_back(moment.at);
            later_ms.push_back(1000.0 * static_cast<double>(moment.at - moment.from) / rate.value);
        }
    }
    if (origin == PulseOrigin::delay) {
        figures.after_trigger_ms = distribution(later_ms);
    } else {
        std::erase(later_ms, 0.0);
        figures.held = later_ms.size();
        figures.held_ms = distribution(later_ms);
    }
    figures.given_in_ripples = in_ripples(moments, origin, MomentFate::given);
    figures.phantoms_in_ripples = in_ripples(moments, origin, MomentFate::phantom);
    std::sort(planned.begin(), planned.end());
    std::sort(came.begin(), came.end());
    const auto as_planned = intervals_s_of(planned, rate), as_kept = intervals_s_of(came, rate);
    figures.planned_intervals_s = distribution(as_planned);
    figures.kept_intervals_s = distribution(as_kept);
    figures.compared = kolmogorov_smirnov(as_kept, as_planned);
}

} // namespace

std::string_view name_of(MomentFate fate) noexcept {
    switch (fate) {
    case MomentFate::given:
        return "given";
    case MomentFate::phantom:
        return "phantom";
    case MomentFate::catch_trial:
        return "catch trial";
    case MomentFate::omitted:
        return "omitted";
    case MomentFate::not_reached:
        return "not reached";
    }
    return "unknown";
}

ControlFigures control_figures(std::span<const Event> events, const Schedule* schedule, const KnownRipples* ripples,
                               Hertz rate) {
    ControlFigures figures;
    figures.moments = moments_in(events);
    std::erase_if(figures.moments, [](const Moment& moment) { return !is_of_a_plan(moment.origin); });
    if (schedule != nullptr) {
        add_not_reached(figures, *schedule);
    }
    std::stable_sort(figures.moments.begin(), figures.moments.end(),
                     [](const Moment& a, const Moment& b) { return a.at < b.at; });
    if (ripples != nullptr) {
        look_for_ripples(figures.moments, *ripples, rate);
    }
    add_figures(figures.scheduled, figures.moments, PulseOrigin::schedule, rate);
    add_figures(figures.delayed, figures.moments, PulseOrigin::delay, rate);
    return figures;
}

} // namespace millpond
