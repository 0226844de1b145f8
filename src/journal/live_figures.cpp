#include "journal/live_figures.hpp"

#include <algorithm>

namespace millpond {
namespace {

// Up to its zero.
template <std::size_t N> std::string text_in(const std::array<char, N>& characters) {
    return {characters.begin(), std::find(characters.begin(), characters.end(), '\0')};
}

} // namespace

void LiveCounters::count(const std::vector<Event>& events, const std::vector<PacketTiming>& timings, Nanos now) {
    const std::lock_guard lock(mutex_);
    turn_seconds(now);
    for (const auto& event : events) {
        count_one(event);
    }
    for (const auto& timing : timings) {
        if (timing.loop_ns != PulseDetail::not_measured) {
            loop_seconds_[second_].add(timing.loop_ns);
        }
    }
}

void LiveCounters::count_one(const Event& event) {
    auto& f = figures_;
    switch (event.kind) {
    case EventKind::detection:
        ++f.detections;
        break;
    case EventKind::trigger:
        ++f.triggers;
        break;
    case EventKind::withheld:
        ++f.withheld[std::min<std::size_t>(event.code, rule_count - 1)];
        break;
    case EventKind::pulse:
        ++f.pulses;
        break;
    case EventKind::note:
        f.notes += event.as<NoteDetail>().continues == 0 ? 1 : 0;
        break;
    case EventKind::gap:
        ++f.gaps;
        f.frames_missing += event.as<GapDetail>().frames;
        break;
    case EventKind::packet_count:
        f.packets[std::min<std::size_t>(event.code, packet_cause_count - 1)] += event.as<CountDetail>().count;
        break;
    case EventKind::state:
        f.state = static_cast<ArmState>(event.code);
        f.state_cause = static_cast<StateCause>(event.as<StateDetail>().cause);
        break;
    case EventKind::epoch: {
        const auto epoch = event.as<EpochDetail>();
        f.epoch = {epoch.index, text_in(epoch.name), event.sample, epoch.frames, epoch.pulses != 0};
        break;
    }
    case EventKind::speed:
        f.speed = event.as<SpeedDetail>().value;
        break;
    case EventKind::gate: {
        const auto gate = event.as<GateDetail>();
        const auto name = text_in(gate.name);
        std::erase(f.gates_closed, name);
        if (gate.open == 0) {
            f.gates_closed.push_back(name);
        }
        break;
    }
    case EventKind::site: {
        const auto channel = event.as<SiteDetail>().channel;
        const auto state = static_cast<SiteState>(event.code);
        std::erase_if(f.sites_out, [channel](const auto& out) { return out.first == channel; });
        if (state != SiteState::alive) {
            f.sites_out.emplace_back(channel, state);
        }
        break;
    }
    case EventKind::floor: {
        const auto floor = event.as<FloorDetail>();
        const auto known = std::find_if(f.floors.begin(), f.floors.end(),
                                        [&floor](const FloorDetail& old) { return old.site == floor.site; });
        known == f.floors.end() ? f.floors.push_back(floor) : void(*known = floor);
        break;
    }
    default:
        break;
    }
}

void LiveCounters::turn_seconds(Nanos now) {
    for (std::size_t turned = 0; now - second_began_ >= std::chrono::seconds{1}; ++turned) {
        second_began_ = turned < loop_seconds_.size() ? second_began_ + std::chrono::seconds{1} : now;
        second_ = (second_ + 1) % loop_seconds_.size();
        loop_seconds_[second_] = LatencyHistogram{};
    }
}

void LiveCounters::set_journal(std::uint64_t records, std::uint64_t events_dropped, std::uint64_t frames_dropped,
                               SampleIndex upto) {
    const std::lock_guard lock(mutex_);
    figures_.records = records;
    figures_.events_dropped = events_dropped;
    figures_.frames_dropped = frames_dropped;
    figures_.upto = upto;
}

void LiveCounters::set_trouble(std::string trouble) {
    const std::lock_guard lock(mutex_);
    if (figures_.trouble.empty()) {
        figures_.trouble = std::move(trouble);
    }
}

LiveFigures LiveCounters::figures() const {
    const std::lock_guard lock(mutex_);
    auto now = figures_;
    LatencyHistogram loop;
    for (const auto& second : loop_seconds_) {
        for (std::uint32_t bin = 0; bin < LatencyHistogram::bin_count; ++bin) {
            loop.add_bin(bin, second.count_in(bin));
        }
    }
    if (loop.count() > 0) {
        now.loop_p50_ns = loop.quantile_ns(0.5);
        now.loop_p99_ns = loop.quantile_ns(0.99);
    }
    return now;
}

} // namespace millpond
