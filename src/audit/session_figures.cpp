#include "audit/session_figures.hpp"

#include <algorithm>
#include <map>

namespace millpond {
namespace {

template <std::size_t N> void add(std::array<std::uint64_t, N>& counts, std::uint8_t code, std::uint64_t count) {
    if (code < N) {
        counts[code] += count;
    }
}

std::uint8_t origin_of(const Event& event) {
    return static_cast<std::uint8_t>(event.as<TriggerDetail>().origin);
}

void count(SessionFigures& figures, const Event& event) {
    switch (event.kind) {
    case EventKind::detection:
        ++figures.detections;
        break;
    case EventKind::trigger:
        ++figures.triggers;
        figures.catch_trials += event.as<TriggerDetail>().caught;
        break;
    case EventKind::withheld:
        add(figures.withheld, event.code, 1);
        break;
    case EventKind::slot:
        add(figures.slots, origin_of(event), 1);
        break;
    case EventKind::omitted:
        add(figures.omitted, event.code, 1);
        break;
    case EventKind::order:
        add(figures.orders, origin_of(event), 1);
        break;
    case EventKind::pulse:
        ++figures.pulses;
        break;
    case EventKind::packet_count:
        add(figures.packets, event.code, event.as<CountDetail>().count);
        break;
    case EventKind::dropped:
        add(figures.dropped, event.code, event.as<CountDetail>().count);
        break;
    default:
        break;
    }
}

void list(SessionFigures& figures, const Event& event) {
    if (event.kind == EventKind::gap) {
        figures.gaps.push_back({event.sample, static_cast<GapCause>(event.code), event.as<GapDetail>().frames});
    } else if (event.kind == EventKind::state) {
        const auto state = event.as<StateDetail>();
        figures.states.push_back({event.sample, event.time_ns, static_cast<ArmState>(state.before),
                                  static_cast<ArmState>(event.code), static_cast<StateCause>(state.cause),
                                  by_of(state)});
    } else if (event.kind == EventKind::gate) {
        const auto gate = event.as<GateDetail>();
        figures.gates.push_back({event.sample, gate_name(gate), gate.open != 0, by_of(gate)});
    } else if (event.kind == EventKind::site) {
        figures.sites.push_back({event.sample, event.as<SiteDetail>().channel, static_cast<SiteState>(event.code)});
    }
}

std::vector<EpochFigure> epochs_in(std::span<const Event> events) {
    std::vector<EpochFigure> epochs;
    for (const auto& event : events) {
        if (event.kind == EventKind::epoch) {
            const auto epoch = event.as<EpochDetail>();
            if (!epochs.empty()) {
                epochs.back().to = event.sample;
            }
            epochs.push_back({event.sample,
                              SampleIndex{UINT64_MAX},
                              epoch.index,
                              epoch_name(epoch),
                              epoch.frames,
                              epoch.pulses != 0,
                              by_of(epoch),
                              0,
                              0,
                              0,
                              {}});
        }
    }
    return epochs;
}

void count_in_epoch(EpochFigure& epoch, const Event& event) {
    epoch.detections += event.kind == EventKind::detection ? 1 : 0;
    epoch.triggers += event.kind == EventKind::trigger ? 1 : 0;
    epoch.pulses += event.kind == EventKind::pulse ? 1 : 0;
    if (event.kind == EventKind::withheld) {
        add(epoch.withheld, event.code, 1);
    }
}

// By sample, not by order of writing: a pulse of the last frame is written after the next epoch began.
void count_by_epoch(std::vector<EpochFigure>& epochs, std::span<const Event> events) {
    for (const auto& event : events) {
        const auto after = std::upper_bound(epochs.begin(), epochs.end(), event.sample,
                                            [](SampleIndex at, const EpochFigure& epoch) { return at < epoch.from; });
        if (after != epochs.begin()) {
            count_in_epoch(*std::prev(after), event);
        }
    }
}

SpeedFigure speed_in(std::span<const Event> events) {
    SpeedFigure figure;
    std::vector<double> speeds;
    for (const auto& event : events) {
        if (event.kind == EventKind::speed) {
            const auto speed = event.as<SpeedDetail>();
            figure.values += speed.values;
            speeds.push_back(speed.value);
        }
    }
    figure.events = speeds.size();
    if (!speeds.empty()) {
        std::sort(speeds.begin(), speeds.end());
        figure.least = speeds.front();
        figure.median = speeds[(speeds.size() - 1) / 2];
        figure.most = speeds.back();
    }
    return figure;
}

FloorFigure figure_of(const std::vector<Event>& floors) {
    FloorFigure figure;
    std::vector<double> means; // once settled; before, they climb from nothing
    for (const auto& event : floors) {
        const auto floor = event.as<FloorDetail>();
        if (floor.settled != 0 && !figure.settled) {
            figure.settled = true;
            figure.settled_at = event.sample;
            means.clear();
        }
        means.push_back(floor.mean);
    }
    const auto last = floors.back().as<FloorDetail>();
    figure.site = last.site;
    figure.events = floors.size();
    figure.mean_last = last.mean;
    figure.deviation_last = last.deviation;
    figure.threshold_last = static_cast<double>(last.threshold);
    std::sort(means.begin(), means.end());
    figure.mean_least = means.front();
    figure.mean_median = means[(means.size() - 1) / 2];
    figure.mean_most = means.back();
    return figure;
}

} // namespace

std::uint64_t SessionFigures::frames_missing() const noexcept {
    std::uint64_t frames = 0;
    for (const auto& gap : gaps) {
        frames += gap.frames;
    }
    return frames;
}

SessionFigures session_figures(std::span<const Event> events) {
    SessionFigures figures;
    std::map<std::uint16_t, std::vector<Event>> floors;
    for (const auto& event : events) {
        count(figures, event);
        list(figures, event);
        if (event.kind == EventKind::floor) {
            floors[event.as<FloorDetail>().site].push_back(event);
        }
    }
    for (const auto& [site, of_site] : floors) {
        figures.floors.push_back(figure_of(of_site));
    }
    figures.notes = notes_in(events);
    figures.epochs = epochs_in(events);
    count_by_epoch(figures.epochs, events);
    figures.speed = speed_in(events);
    figures.outputs = output_figures(events);
    const auto& outputs = figures.outputs;
    const auto first = std::find_if(outputs.begin(), outputs.end(), [](const auto& output) { return !output.marker; });
    figures.pulse_ends = first != outputs.end() ? first->ends : 0;
    return figures;
}

} // namespace millpond
