#include "app/limits_findings.hpp"

#include "arbiter/runaway_guard.hpp"
#include "base/refusal.hpp"
#include "stimulus/stimulus.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

Finding good(const std::string& about, const std::string& found) {
    return {Fitness::good, about, found};
}

Finding caution(const std::string& about, const std::string& found) {
    return {Fitness::caution, about, found};
}

/// Triggers that fit into a stretch that does not include its own end, `apart_ms` from one to the next.
double most_in(double stretch_ms, double apart_ms) {
    return apart_ms > 0.0 ? std::ceil(stretch_ms / apart_ms) : 1e9;
}

double apart_ms(const ArbiterSettings& arbiter) {
    return std::max(arbiter.lockout_ms, arbiter.limits.min_interval_ms);
}

Finding rates(const ArbiterSettings& arbiter) {
    const auto& limits = arbiter.limits;
    const double second = std::min<double>(limits.max_pulses_per_second, most_in(1000.0, apart_ms(arbiter)));
    const double minute = std::min(60.0 * second, most_in(60'000.0, apart_ms(arbiter)));
    std::string never;
    if (limits.max_pulses_per_second > second) {
        never += fmt::format("; {} a second can never be reached: {:g} ms from one trigger to the next leave {:g}",
                             limits.max_pulses_per_second, apart_ms(arbiter), second);
    }
    if (limits.max_pulses_per_minute > minute) {
        never += fmt::format("; {} a minute can never be reached: the other limits leave {:g}",
                             limits.max_pulses_per_minute, minute);
    }
    if (limits.min_interval_ms > 0.0 && limits.min_interval_ms <= arbiter.lockout_ms) {
        never += fmt::format("; min_interval_ms {:g} does nothing beside a lock-out of {:g} ms", limits.min_interval_ms,
                             arbiter.lockout_ms);
    }
    const auto found = fmt::format("at most {:g} triggers a second, {:g} a minute", second,
                                   std::min<double>(minute, limits.max_pulses_per_minute));
    return never.empty() ? good("limits", found) : caution("limits", found + never);
}

/// Minutes after which so many triggers were let through, at the rate that is expected at most.
double minutes_to(double triggers, const ArbiterSettings& arbiter) {
    const double per_minute =
        std::min<double>(60.0 * arbiter.limits.runaway.expected_per_s, arbiter.limits.max_pulses_per_minute);
    return triggers / per_minute;
}

Finding session_limit(const ArbiterSettings& arbiter) {
    const auto& limits = arbiter.limits;
    double planned = 0.0;
    for (const auto& epoch : arbiter.plan.epochs) {
        planned += epoch.pulses ? epoch.minutes : 0.0;
    }
    const double minutes = minutes_to(limits.max_pulses_per_session, arbiter);
    const auto found = fmt::format("{} triggers are reached after {:.0f} minutes at {:g} a second, the most expected",
                                   limits.max_pulses_per_session, minutes, limits.runaway.expected_per_s);
    return planned > minutes
               ? caution("session limit", found + fmt::format("; the plan has {:g} minutes with pulses", planned))
               : good("session limit", found);
}

std::vector<Finding> plan(const ArbiterSettings& arbiter) {
    std::vector<Finding> findings;
    if (arbiter.plan.epochs.empty()) {
        return findings;
    }
    std::string text;
    for (const auto& epoch : arbiter.plan.epochs) {
        text += fmt::format("{}{} {}{}", text.empty() ? "" : ", ", epoch.name,
                            epoch.minutes > 0.0 ? fmt::format("{:g} min", epoch.minutes) : "until /epoch",
                            epoch.pulses ? "" : " (no pulses)");
        const double minutes = minutes_to(arbiter.limits.max_pulses_per_epoch, arbiter);
        if (epoch.pulses && epoch.minutes > minutes) {
            findings.push_back(
                caution("epoch limit",
                        fmt::format("{}: {} triggers are reached after {:.0f} of its {:g} minutes at {:g} a second",
                                    epoch.name, arbiter.limits.max_pulses_per_epoch, minutes, epoch.minutes,
                                    arbiter.limits.runaway.expected_per_s)));
        }
    }
    findings.insert(findings.begin(),
                    good("plan", text + (arbiter.plan.ends_session ? "; then the session ends" : "")));
    return findings;
}

Finding runaway(const ArbiterSettings& arbiter) {
    const auto& guard = arbiter.limits.runaway;
    if (!guard.on) {
        return caution("runaway guard", "off (limits.runaway.on)");
    }
    const auto bound = runaway_bound(guard.expected_per_s, guard.window_s, guard.false_alarms_per_hour);
    auto found =
        fmt::format("faults at {} triggers within {:g} s, or {} intervals below {:g} ms within {:g} ms of each "
                    "other; by chance at most {:g} times an hour at {:g} a second",
                    bound, guard.window_s, guard.equal_intervals, guard.equal_below_ms, guard.equal_within_ms,
                    guard.false_alarms_per_hour, guard.expected_per_s);
    const bool many_cannot = most_in(guard.window_s * 1000.0, arbiter.lockout_ms) < bound;
    const bool equal_cannot = guard.equal_below_ms <= arbiter.lockout_ms;
    if (many_cannot) {
        found += fmt::format("; a lock-out of {:g} ms never lets so many through", arbiter.lockout_ms);
    }
    if (equal_cannot) {
        found += "; no interval is as short as equal_below_ms beside this lock-out";
    }
    return many_cannot || equal_cannot ? caution("runaway guard", found) : good("runaway guard", found);
}

Finding speed_gate(const Settings& settings) {
    const auto& gate = settings.arbiter.speed_gate;
    return gate.on && !settings.control.listen
               ? Finding{Fitness::bad, "speed gate",
                         "no speed can come: control.listen is false; the gate stays closed"}
               : good("speed gate", told(gate));
}

} // namespace

std::vector<Finding> check_limits(const Settings& settings) {
    std::vector<Finding> findings{rates(settings.arbiter), session_limit(settings.arbiter), runaway(settings.arbiter)};
    const auto more = plan(settings.arbiter);
    findings.insert(findings.end(), more.begin(), more.end());
    if (settings.arbiter.speed_gate.on) {
        findings.push_back(speed_gate(settings));
    }
    return findings;
}

std::vector<Finding> check_stimulus(const StimulusSettings& stimulus) {
    std::vector<Finding> findings;
    try {
        if (const auto figures = stimulus_figures(stimulus)) {
            findings.push_back(good("stimulus", told(*figures)));
            for (const auto& warning : stimulus_warnings(*figures)) {
                findings.push_back(caution("stimulus", warning));
            }
        }
    } catch (const Refusal& refusal) {
        findings.push_back({Fitness::bad, "stimulus", refusal.what()});
    }
    return findings;
}

std::string told(const SpeedGateSettings& gate) {
    const std::string unit(word_for<SpeedUnit>(speed_units, gate.unit));
    return fmt::format(
        "closes above {:g} {}, opens below {:g} {} for {:g} ms, closes when no speed came for {:g} ms; the "
        "speeds are {:g} ms late, as you state, and nothing is corrected for that",
        gate.closes_above, unit, gate.opens_below, unit, gate.hold_ms, gate.stale_after_ms, gate.delay_ms);
}

} // namespace millpond
