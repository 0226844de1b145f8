#include "referee/eligible_time.hpp"

#include <algorithm>
#include <map>
#include <string>

namespace millpond {
namespace {

// Stretches in which something stood in the way; `open_since` is where one began that has not ended yet.
class Obstacles {
  public:
    void add(SampleIndex from, SampleIndex to) {
        if (from < to) {
            found_.push_back({from, to});
        }
    }

    [[nodiscard]] Intervals outside(SampleIndex from, SampleIndex to) {
        std::sort(found_.begin(), found_.end(), [](const Interval& a, const Interval& b) { return a.from < b.from; });
        Intervals clear;
        SampleIndex at = from;
        for (const auto& obstacle : found_) {
            if (obstacle.from >= to) {
                break;
            }
            if (obstacle.from > at) {
                clear.push_back({at, obstacle.from});
            }
            at = std::max(at, obstacle.to);
        }
        if (at < to) {
            clear.push_back({at, to});
        }
        return clear;
    }

  private:
    Intervals found_;
};

// A condition that holds or not from one event on; its unmet stretches are obstacles.
class Switch {
  public:
    Switch(bool met, SampleIndex from) : met_(met), since_(from) {}

    void set(bool met, SampleIndex at, Obstacles& obstacles) {
        if (met != met_ && !met_) {
            obstacles.add(since_, at);
        }
        if (met != met_) {
            met_ = met;
            since_ = at;
        }
    }

  private:
    bool met_;
    SampleIndex since_;
};

std::string gate_name(const GateDetail& gate) {
    const auto end = std::find(gate.name.begin(), gate.name.end(), '\0');
    return {gate.name.begin(), end};
}

class Walk {
  public:
    Walk(const EligibleRules& rules, Hertz rate, SampleIndex from)
        : rules_(rules), rate_(rate), settled_(false, from), armed_(!rules.session, from), gates_(true, from),
          plan_(true, from) {
        obstacles_.add(from, from + rules.settle_frames);
    }

    void take(const Event& event) {
        switch (event.kind) {
        case EventKind::gap:
            obstacles_.add(event.sample, event.sample + event.as<GapDetail>().frames + rules_.settle_frames);
            break;
        case EventKind::floor:
            take_floor(event.as<FloorDetail>(), event.sample);
            break;
        case EventKind::trigger:
            take_trigger(event.sample);
            break;
        case EventKind::slot:
            blank(event.sample);
            break;
        case EventKind::state:
            armed_.set(!rules_.session || event.code == static_cast<std::uint8_t>(ArmState::armed), event.sample,
                       obstacles_);
            break;
        case EventKind::gate:
            take_gate(event.as<GateDetail>(), event.sample);
            break;
        case EventKind::epoch:
            plan_.set(!rules_.session || event.as<EpochDetail>().pulses != 0, event.sample, obstacles_);
            break;
        default:
            break;
        }
    }

    [[nodiscard]] Intervals close(SampleIndex from, SampleIndex to) {
        settled_.set(true, std::max(from, to), obstacles_);
        armed_.set(true, std::max(from, to), obstacles_);
        gates_.set(true, std::max(from, to), obstacles_);
        plan_.set(true, std::max(from, to), obstacles_);
        return obstacles_.outside(from, to);
    }

  private:
    void take_floor(const FloorDetail& floor, SampleIndex at) {
        site_settled_[floor.site] = floor.settled != 0;
        const bool all =
            std::all_of(site_settled_.begin(), site_settled_.end(), [](const auto& s) { return s.second; });
        settled_.set(all, at, obstacles_);
    }

    void blank(SampleIndex from) { obstacles_.add(from, from + frames_in_ms(rules_.blanking_ms, rate_)); }

    void take_trigger(SampleIndex at) {
        blank(at + 1);
        if (rules_.session) {
            obstacles_.add(at + 1, at + std::max<std::uint64_t>(1, frames_in_ms(rules_.lockout_ms, rate_)));
        }
    }

    void take_gate(const GateDetail& gate, SampleIndex at) {
        gate_open_[gate_name(gate)] = gate.open != 0;
        const bool all = std::all_of(gate_open_.begin(), gate_open_.end(), [](const auto& g) { return g.second; });
        gates_.set(!rules_.session || all, at, obstacles_);
    }

    EligibleRules rules_;
    Hertz rate_;
    Obstacles obstacles_;
    Switch settled_, armed_, gates_, plan_;
    std::map<std::uint16_t, bool> site_settled_;
    std::map<std::string, bool> gate_open_;
};

bool refused_by_detector(Rule rule) noexcept {
    return rule == Rule::gap || rule == Rule::unsettled || rule == Rule::veto;
}

} // namespace

Intervals eligible_time(std::span<const Event> events, const EligibleRules& rules, Hertz rate, SampleIndex from,
                        SampleIndex to) {
    Walk walk(rules, rate, from);
    for (const auto& event : events) {
        if (event.sample < to) {
            walk.take(event);
        }
    }
    return walk.close(from, to);
}

bool contains(const Intervals& intervals, SampleIndex at) noexcept {
    const auto after = std::upper_bound(intervals.begin(), intervals.end(), at,
                                        [](SampleIndex place, const Interval& i) { return place < i.from; });
    return after != intervals.begin() && at < std::prev(after)->to;
}

std::uint64_t frames_in(const Intervals& intervals) noexcept {
    std::uint64_t frames = 0;
    for (const auto& interval : intervals) {
        frames += interval.to - interval.from;
    }
    return frames;
}

Intervals intersection(const Intervals& a, const Intervals& b) {
    Intervals both;
    for (std::size_t i = 0, j = 0; i < a.size() && j < b.size();) {
        const SampleIndex from = std::max(a[i].from, b[j].from);
        const SampleIndex to = std::min(a[i].to, b[j].to);
        if (from < to) {
            both.push_back({from, to});
        }
        a[i].to < b[j].to ? ++i : ++j;
    }
    return both;
}

Intervals without(const Intervals& intervals, const Intervals& excluded) {
    Intervals left;
    std::size_t next = 0;
    for (auto interval : intervals) {
        while (next < excluded.size() && excluded[next].to <= interval.from) {
            ++next;
        }
        for (std::size_t i = next; i < excluded.size() && excluded[i].from < interval.to; ++i) {
            if (excluded[i].from > interval.from) {
                left.push_back({interval.from, excluded[i].from});
            }
            interval.from = std::max(interval.from, excluded[i].to);
        }
        if (interval.from < interval.to) {
            left.push_back(interval);
        }
    }
    return left;
}

bool touches(const Intervals& intervals, SampleIndex first, SampleIndex last) noexcept {
    const auto after = std::upper_bound(intervals.begin(), intervals.end(), last,
                                        [](SampleIndex place, const Interval& i) { return place < i.from; });
    return after != intervals.begin() && first < std::prev(after)->to;
}

std::vector<SampleIndex> detections_to_score(std::span<const Event> events) {
    std::vector<SampleIndex> detections;
    for (const auto& event : events) {
        if (event.kind == EventKind::detection) {
            detections.push_back(event.sample);
        } else if (event.kind == EventKind::withheld && refused_by_detector(static_cast<Rule>(event.code)) &&
                   !detections.empty() && detections.back() == event.sample) {
            detections.pop_back();
        }
    }
    return detections;
}

} // namespace millpond
