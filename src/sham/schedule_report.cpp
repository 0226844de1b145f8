#include "sham/schedule_report.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace millpond {
namespace {

std::string line(const char* name, const std::string& said) {
    return fmt::format("{:<11} {}\n", name, said);
}

std::string told(const Distribution& intervals) {
    return fmt::format("median {:.3f} s, quartiles {:.3f} to {:.3f} s, least {:.3f} s", intervals.median,
                       intervals.quartile1, intervals.quartile3, intervals.least);
}

std::string told(const Crowding& crowding, const ScheduleLimits& limits, std::uint64_t places) {
    return fmt::format("{} places within the lock-out ({} ms) of the one before; at most {} within a second ({} "
                       "allowed), {} within a minute ({}), {} within an epoch ({}), {} in all ({})",
                       crowding.within_lockout, limits.lockout_ms, crowding.most_in_a_second,
                       limits.max_pulses_per_second, crowding.most_in_a_minute, limits.max_pulses_per_minute,
                       crowding.most_in_an_epoch, limits.max_pulses_per_epoch, places, limits.max_pulses_per_session);
}

std::string inside_lines(const ScheduleReport& report) {
    std::string text;
    if (report.ripple_time) {
        const auto& time = *report.ripple_time;
        text += line("inside", fmt::format("{:.1f} % of places expected in ripples where they know nothing of them: "
                                           "rate x mean duration = {:.4f} /s x {:.1f} ms ({})",
                                           100.0 * time.share(), time.rate_per_s, time.mean_duration_ms, time.of));
    }
    if (report.inside) {
        const auto& part = *report.inside;
        text +=
            line("", fmt::format("{} of {} places, {:.1f} % (95 % interval {:.1f} to {:.1f} %), in the very ripples "
                                 "of that table",
                                 part.count, part.of, 100.0 * part.share, 100.0 * part.low, 100.0 * part.high));
    }
    return text.empty()
               ? line("inside", "share in ripples not known: no ripples given (--ripples, or --ripple-rate-per-s with "
                                "--ripple-mean-ms)")
               : text;
}

} // namespace

double RippleTime::share() const noexcept {
    return std::min(1.0, rate_per_s * mean_duration_ms / 1000.0);
}

RippleTime ripple_time(const Ripples& ripples, Hertz rate, const std::string& where) {
    Schedule onsets;
    std::uint64_t frames = 0;
    for (const auto& ripple : ripples) {
        onsets.push_back(ripple.onset);
        frames += ripple.end - ripple.onset + 1;
    }
    RippleTime time;
    time.rate_per_s = rate_per_s_of(onsets, rate, where);
    time.mean_duration_ms = 1000.0 * static_cast<double>(frames) / rate.value / static_cast<double>(ripples.size());
    time.of = where;
    return time;
}

bool inside(const Ripples& ripples, SampleIndex at, std::uint64_t early_frames) noexcept {
    // The last one whose onset, less `early`, is not after `at`; ripples before it have ended.
    const auto after = std::upper_bound(ripples.begin(), ripples.end(), at + early_frames,
                                        [](SampleIndex place, const Ripple& ripple) { return place < ripple.onset; });
    if (after == ripples.begin()) {
        return false;
    }
    const auto last = after - 1;
    return at <= last->end || (last != ripples.begin() && at <= (last - 1)->end);
}

ScheduleReport report_on(const Schedule& schedule, const ScheduleLimits& limits, const ReportInput& with, Hertz rate) {
    ScheduleReport report;
    report.places = schedule.size();
    report.limits = limits;
    report.crowding = crowding(schedule, limits, rate);
    if (!schedule.empty()) {
        report.first_s = seconds_at(schedule.front(), rate);
        report.last_s = seconds_at(schedule.back(), rate);
    }
    if (schedule.size() > 1) {
        report.rate_per_s = rate_per_s_of(schedule, rate, "schedule");
    }
    const auto intervals = intervals_s_of(schedule, rate);
    report.intervals_s = distribution(intervals);
    if (!with.source.empty()) {
        const auto of_source = intervals_s_of(with.source, rate);
        report.source_name = with.source_name;
        report.source_intervals_s = distribution(of_source);
        report.compared = kolmogorov_smirnov(intervals, of_source);
    }
    report.ripple_time = with.ripple_time;
    if (with.ripples) {
        const auto count = std::count_if(schedule.begin(), schedule.end(),
                                         [&](SampleIndex place) { return inside(*with.ripples, place); });
        report.inside = proportion(static_cast<std::uint64_t>(count), schedule.size());
    }
    return report;
}

std::string told(const ScheduleReport& report) {
    if (report.places == 0) {
        return line("places", "0");
    }
    auto text =
        line("places", fmt::format("{}, from {:.3f} to {:.3f} s", report.places, report.first_s, report.last_s));
    if (report.places > 1) {
        text += line("rate", fmt::format("{:.4f} /s from first to last", report.rate_per_s));
        text += line("intervals", told(report.intervals_s));
    }
    if (report.source_name.empty()) {
        text += line("compared", "with nothing: no source");
    } else {
        if (report.compared.second > 0) {
            text += line("source's", told(report.source_intervals_s));
        }
        text += line("compared", told(report.compared, "intervals"));
    }
    return text + line("limits", told(report.crowding, report.limits, report.places)) + inside_lines(report);
}

} // namespace millpond
