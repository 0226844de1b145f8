#include "app/sham_source.hpp"

#include "app/session_conditions.hpp"
#include "base/refusal.hpp"
#include "journal/session_reader.hpp"
#include "recording/events_table.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

/// Orders where there are any, else triggers.
void choose(ShamSource& source, Schedule orders, Schedule triggers) {
    source.given = !orders.empty();
    source.places = source.given ? std::move(orders) : std::move(triggers);
    std::sort(source.places.begin(), source.places.end());
    if (source.places.empty()) {
        throw Refusal(source.name, "no order and no trigger", "the events of a session or dry run with either");
    }
}

void note_moment(ShamSource& source, const Event& event) {
    if (event.kind == EventKind::epoch) {
        source.epochs.emplace(epoch_name(event.as<EpochDetail>()), event.sample);
    }
    if (event.kind != EventKind::state) {
        return;
    }
    if (event.as<StateDetail>().cause == static_cast<std::uint8_t>(StateCause::start)) {
        source.first = event.sample;
    }
    if (event.code == static_cast<std::uint8_t>(ArmState::armed) && !source.armed) {
        source.armed = event.sample;
    }
}

ShamSource source_of_session(const std::filesystem::path& folder, std::optional<Hertz> said, const std::string& where) {
    const SessionReader session(folder);
    if (said && *said != session.rate()) {
        throw Refusal(where, fmt::format("{}", said->value),
                      fmt::format("the rate of {}, {}", folder.string(), session.rate().value));
    }
    ShamSource source;
    source.name = folder.string();
    source.session = true;
    source.rate = session.rate();
    const auto assignment = known_assignment(session);
    source.sealed = assignment && assignment->sealed && assignment->conditions.empty();
    Schedule orders, triggers;
    for (const auto& event : session.events()) {
        note_moment(source, event);
        if (event.kind == EventKind::order && !source.sealed) {
            orders.push_back(event.sample);
        } else if (event.kind == EventKind::trigger) {
            triggers.push_back(event.sample);
        }
    }
    choose(source, std::move(orders), std::move(triggers));
    return source;
}

SampleIndex place_in(const std::filesystem::path& table, const TableEvent& event, Hertz rate) {
    if (event.sample < 0 || std::abs(static_cast<double>(event.sample) - event.onset_s * rate.value) > 1.0) {
        throw Refusal(table.string() + ": sample", fmt::format("{} for {} s", event.sample, event.onset_s),
                      fmt::format("the events of a stream of {} Hz (--sampling-hz)", rate.value));
    }
    return SampleIndex{static_cast<std::uint64_t>(event.sample)};
}

ShamSource source_of_table(const std::filesystem::path& table, Hertz rate) {
    ShamSource source;
    source.name = table.string();
    source.rate = rate;
    Schedule orders, triggers;
    for (const auto& event : read_events_table(table, rate.value)) {
        if (event.trial_type == "order") {
            orders.push_back(place_in(table, event, rate));
        } else if (event.trial_type == "trigger") {
            triggers.push_back(place_in(table, event, rate));
        } else if (const auto name = event.extra.find("text");
                   event.trial_type == "epoch" && name != event.extra.end()) {
            source.epochs.emplace(name->second, place_in(table, event, rate));
        }
    }
    choose(source, std::move(orders), std::move(triggers));
    return source;
}

std::string moments_of(const ShamSource& source) {
    std::string text = source.armed ? "first, armed" : "first";
    for (const auto& [name, at] : source.epochs) {
        text += ", " + name;
    }
    return text;
}

} // namespace

std::string ShamSource::told() const {
    return fmt::format("{}: {} {}", name, places.size(),
                       given    ? "orders: the pulses that were given"
                       : sealed ? "triggers: its condition is sealed, and so are its pulses (millpond unblind)"
                                : "triggers: no order in it, no pulse was given");
}

ShamSource read_sham_source(const std::filesystem::path& source, std::optional<Hertz> said, const std::string& where) {
    if (std::filesystem::is_directory(source)) {
        return source_of_session(source, said, where);
    }
    if (!said) {
        throw Refusal("--sampling-hz", "nothing", "the rate of the stream that " + source.string() + " tells of");
    }
    return source_of_table(source, *said);
}

SampleIndex moment_of(const ShamSource& source, const std::string& align) {
    if (align == "first") {
        return source.first;
    }
    if (align == "armed" && source.armed) {
        return *source.armed;
    }
    const auto epoch = source.epochs.find(align);
    if (epoch == source.epochs.end()) {
        throw Refusal("--align", "'" + align + "'", "a moment of " + source.name + ": " + moments_of(source));
    }
    return epoch->second;
}

} // namespace millpond
