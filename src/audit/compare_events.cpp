#include "audit/rerun.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace millpond {
namespace {

bool same(const Event& a, const Event& b) {
    return a.kind == b.kind && a.code == b.code && a.sample == b.sample && a.detail == b.detail;
}

// The first event of `events` for which `fits` holds, taken out of it.
template <class Fits> std::optional<Event> take_first(std::vector<Event>& events, Fits fits) {
    const auto found = std::find_if(events.begin(), events.end(), fits);
    if (found == events.end()) {
        return std::nullopt;
    }
    const auto event = *found;
    events.erase(found);
    return event;
}

bool verdict(const Event& event) {
    return event.kind == EventKind::trigger || event.kind == EventKind::withheld || event.kind == EventKind::slot ||
           event.kind == EventKind::omitted;
}

Difference difference(const std::optional<Event>& journaled, const std::optional<Event>& again) {
    Difference found{journaled ? journaled->sample : again->sample, journaled, again, {}};
    if (journaled && again) {
        const bool detail_alone = journaled->kind == again->kind && journaled->code == again->code;
        found.what = detail_alone ? fmt::format("{}: details differ", told(*journaled))
                                  : fmt::format("journal: {}; re-run: {}", told(*journaled), told(*again));
    } else {
        found.what = journaled ? fmt::format("only in the journal: {}", told(*journaled))
                               : fmt::format("only in the re-run: {}", told(*again));
    }
    return found;
}

// What is left of the two at one sample once all that is the same is gone, paired where one kind stands for the other.
void compare_at_one_sample(std::vector<Event> journaled, std::vector<Event> again, std::vector<Difference>& found) {
    std::erase_if(journaled, [&again](const Event& event) {
        return take_first(again, [&event](const Event& other) { return same(event, other); }).has_value();
    });
    for (const auto& event : journaled) {
        auto other = take_first(again, [&event](const Event& candidate) { return candidate.kind == event.kind; });
        if (!other && verdict(event)) {
            other = take_first(again, verdict);
        }
        found.push_back(difference(event, other));
    }
    for (const auto& event : again) {
        found.push_back(difference(std::nullopt, event));
    }
}

} // namespace

std::string told(const Event& event) {
    const auto name = name_of(event.kind);
    const auto at = event.sample.value;
    switch (event.kind) {
    case EventKind::withheld:
    case EventKind::omitted:
        return fmt::format("{} at {} ({})", name, at, name_of(static_cast<Rule>(event.code)));
    case EventKind::gap:
        return fmt::format("{} at {} ({}, {} frames)", name, at, name_of(static_cast<GapCause>(event.code)),
                           event.as<GapDetail>().frames);
    case EventKind::state:
        return fmt::format("{} at {} ({})", name, at, name_of(static_cast<ArmState>(event.code)));
    case EventKind::gate: {
        const auto gate = event.as<GateDetail>();
        return fmt::format("{} at {} ({} {})", name, at, gate_name(gate), gate.open != 0 ? "open" : "closed");
    }
    case EventKind::epoch: {
        const auto epoch = event.as<EpochDetail>();
        return fmt::format("{} at {} ({})", name, at, epoch_name(epoch));
    }
    case EventKind::floor:
        return fmt::format("{} at {} (site {})", name, at, event.as<FloorDetail>().site);
    case EventKind::site:
        return fmt::format("{} at {} (channel {} {})", name, at, event.as<SiteDetail>().channel,
                           name_of(static_cast<SiteState>(event.code)));
    default:
        return fmt::format("{} at {}", name, at);
    }
}

std::vector<Difference> compare_events(const std::vector<Event>& journaled, const std::vector<Event>& again) {
    std::vector<Difference> found;
    auto left = journaled.begin();
    auto right = again.begin();
    while (left != journaled.end() || right != again.end()) {
        const auto at = right == again.end()                                      ? left->sample
                        : left == journaled.end() || right->sample < left->sample ? right->sample
                                                                                  : left->sample;
        const auto there = [at](const Event& event) { return event.sample != at; };
        const auto left_end = std::find_if(left, journaled.end(), there);
        const auto right_end = std::find_if(right, again.end(), there);
        compare_at_one_sample({left, left_end}, {right, right_end}, found);
        left = left_end;
        right = right_end;
    }
    return found;
}

} // namespace millpond
