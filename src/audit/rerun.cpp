#include "audit/rerun.hpp"

#include "journal/journal_sink.hpp"

#include <algorithm>

namespace millpond {
namespace {

bool decided_by_the_engine(const Event& event) {
    switch (event.kind) {
    case EventKind::detection:
    case EventKind::trigger:
    case EventKind::withheld:
    case EventKind::slot:
    case EventKind::omitted:
    case EventKind::order:
    case EventKind::trial:
    case EventKind::gap:
    case EventKind::state:
    case EventKind::gate:
    case EventKind::floor:
    case EventKind::site:
    case EventKind::epoch:
        return true;
    default:
        return false;
    }
}

bool is_decision(EventKind kind) {
    return kind == EventKind::detection || kind == EventKind::trigger || kind == EventKind::withheld ||
           kind == EventKind::slot || kind == EventKind::omitted || kind == EventKind::order;
}

class Collector final : public EventSink {
  public:
    void take(const Event& event) noexcept override {
        if (decided_by_the_engine(event)) {
            events.push_back(event);
        }
    }
    std::vector<Event> events;
};

// Faults that the engine finds by itself.
bool found_again(StateCause cause) {
    return cause == StateCause::runaway || cause == StateCause::too_many_gaps ||
           cause == StateCause::floor_out_of_range;
}

bool is_start(const Event& event) {
    return event.kind == EventKind::state &&
           event.as<StateDetail>().cause == static_cast<std::uint8_t>(StateCause::start);
}

// Places of the control schedule that the session came to, as journaled.
std::vector<SampleIndex> schedule_of(const SessionReader& session) {
    std::vector<SampleIndex> places;
    for (const auto& event : session.events()) {
        const bool moment = event.kind == EventKind::slot || event.kind == EventKind::omitted;
        if (moment && event.as<TriggerDetail>().origin == PulseOrigin::schedule) {
            places.push_back(SampleIndex{event.as<TriggerDetail>().from});
        }
    }
    std::sort(places.begin(), places.end());
    return places;
}

std::vector<FloorState> warm_start_of(const SessionReader& session) {
    std::vector<FloorState> floors;
    for (const auto& floor : session.provenance().about.warm_start) {
        floors.push_back({floor.mean, floor.deviation, floor.frames});
    }
    return floors;
}

Detector make_detector(const SessionReader& session, const EngineSettings& settings, const std::string& where) {
    auto detector = Detector::make(settings.detector, session.provenance().about.channels, session.rate(),
                                   KernelWidth::automatic, where + ": detector");
    if (const auto floors = warm_start_of(session); !floors.empty()) {
        detector.warm_start(floors);
    }
    return detector;
}

// Where both the journal and the samples can be believed.
void limit(const SessionReader& session, std::uint64_t stored_frames, Rerun& rerun) {
    rerun.upto = session.end();
    rerun.upto_why = session.cut() ? "the journal was cut there" : "the session ended there";
    for (const auto& event : session.events()) {
        if (event.kind == EventKind::dropped && event.code == static_cast<std::uint8_t>(Dropped::frames) &&
            event.sample < rerun.upto) {
            rerun.upto = event.sample;
            rerun.upto_why = "frames were dropped there";
        }
    }
    if (SampleIndex{stored_frames} < rerun.upto) {
        rerun.upto = SampleIndex{stored_frames};
        rerun.upto_why = "the stored samples end there";
    }
}

/// Feeds the stored samples, and what came from outside where it came.
class Feed {
  public:
    Feed(SampleFileReader& samples, Engine& engine, const Rerun& rerun, bool trials_by_command,
         const ShareDone& progress)
        : samples_(samples), engine_(engine), rerun_(rerun), trials_by_command_(trials_by_command), progress_(progress),
          next_(rerun.from), buffer_(4096 * samples.channels()) {
        samples_.seek(next_);
    }

    void frames_upto(SampleIndex to) {
        to = std::min(to, rerun_.upto);
        while (next_ < to) {
            const auto wanted = std::min<std::uint64_t>(4096, to - next_);
            const std::span<float> part(buffer_.data(), wanted * samples_.channels());
            const auto got = samples_.read(part);
            if (got == 0) {
                return; // shorter than its header says; the comparison shows it
            }
            engine_.process({next_, samples_.channels(), part.first(got * samples_.channels())}, cause_);
            next_ = next_ + got;
            tell();
        }
    }

    void event(const Event& event) {
        switch (event.kind) {
        case EventKind::state: {
            frames_upto(event.sample);
            const auto state = event.as<StateDetail>();
            if (const auto cause = static_cast<StateCause>(state.cause); !found_again(cause)) {
                engine_.set_state(static_cast<ArmState>(event.code), cause, by_of(state));
            }
            break;
        }
        case EventKind::epoch:
            // One that had its length is found again, at its place.
            if (const auto by = by_of(event.as<EpochDetail>()); by.source != ChangeSource::plan) {
                frames_upto(event.sample);
                engine_.next_epoch(by);
            }
            break;
        case EventKind::gate: {
            frames_upto(event.sample);
            const auto gate = event.as<GateDetail>();
            engine_.set_gate(gate_name(gate), gate.open != 0, by_of(gate));
            break;
        }
        case EventKind::trial:
            if (trials_by_command_) {
                frames_upto(event.sample);
                engine_.next_trial();
            }
            break;
        case EventKind::gap:
            frames_upto(event.sample);
            gap(event.sample + event.as<GapDetail>().frames, static_cast<GapCause>(event.code));
            break;
        default:
            break;
        }
    }

  private:
    void gap(SampleIndex to, GapCause cause) {
        if (cause == GapCause::non_finite) {
            // The engine finds it by itself; as one gap where the block ends as it did then.
            frames_upto(to);
            return;
        }
        if (to > next_) {
            cause_ = cause;
            next_ = to;
            samples_.seek(next_);
        }
    }

    void tell() {
        if (progress_ && ++blocks_ % 64 == 0) {
            progress_(static_cast<double>(next_ - rerun_.from) / static_cast<double>(rerun_.upto - rerun_.from));
        }
    }

    SampleFileReader& samples_;
    Engine& engine_;
    const Rerun& rerun_;
    bool trials_by_command_;
    const ShareDone& progress_;
    SampleIndex next_;
    GapCause cause_ = GapCause::packet_loss;
    std::vector<float> buffer_;
    std::uint64_t blocks_ = 0;
};

void assign(Engine& engine, const SessionAssignment& assignment, Hertz rate) {
    const bool blocks = assignment.unit == AssignmentUnit::block;
    const std::vector<Condition> unknown(assignment.units, Condition::none);
    engine.assign(assignment.conditions.empty() ? unknown : assignment.conditions,
                  blocks ? frames_in_ms(assignment.block_minutes * 60000.0, rate) : 0);
}

void run(const SessionReader& session, SampleFileReader& samples, const EngineSettings& settings,
         const std::optional<SessionAssignment>& assignment, const std::string& where, Rerun& rerun, Collector& sink,
         const ShareDone& progress) {
    NoPulsePort port;
    Engine engine(make_detector(session, settings, where), settings.arbiter, schedule_of(session), session.rate(), sink,
                  port);
    if (assignment) {
        assign(engine, *assignment, session.rate());
    }
    engine.start(rerun.from, settings.arbiter.start_armed);
    Feed feed(samples, engine, rerun, assignment && assignment->unit == AssignmentUnit::trial, progress);
    const auto& events = session.events();
    // Gates and state as they were at the start are the engine's own words, not commands.
    auto from = std::find_if(events.begin(), events.end(), is_start);
    from = from == events.end() ? events.begin() : from + 1;
    for (auto event = from; event != events.end() && event->sample < rerun.upto; ++event) {
        feed.event(*event);
    }
    feed.frames_upto(rerun.upto);
    engine.finish();
}

std::vector<Event> compared_part(const std::vector<Event>& events, const Rerun& rerun, bool sealed) {
    std::vector<Event> part;
    std::copy_if(events.begin(), events.end(), std::back_inserter(part), [&](const Event& event) {
        return decided_by_the_engine(event) && event.sample < rerun.upto && !(sealed && tells_of_condition(event.kind));
    });
    std::stable_sort(part.begin(), part.end(), [](const Event& a, const Event& b) { return a.sample < b.sample; });
    return part;
}

} // namespace

Rerun rerun_session(const SessionReader& session, const EngineSettings& settings, const std::string& where,
                    const ShareDone& progress, const std::optional<SessionAssignment>& assignment) {
    Rerun rerun;
    auto samples = session.open_samples();
    if (!samples) {
        rerun.why_not = "the session stored no samples (session.store_samples: none)";
        return rerun;
    }
    if (samples->channels() != session.provenance().about.channels.size()) {
        rerun.why_not = "the stored samples do not have the session's channels";
        return rerun;
    }
    const auto start = std::find_if(session.events().begin(), session.events().end(), is_start);
    rerun.from = start == session.events().end() ? SampleIndex{} : start->sample;
    limit(session, samples->frames(), rerun);
    if (rerun.upto <= rerun.from) {
        rerun.why_not = "the session has no stretch with both samples and records";
        return rerun;
    }
    Collector sink;
    run(session, *samples, settings, assignment, where, rerun, sink, progress);
    const bool sealed = assignment && assignment->conditions.empty();
    const auto journaled = compared_part(session.events(), rerun, sealed);
    rerun.differences = compare_events(journaled, compared_part(sink.events, rerun, sealed));
    rerun.compared = journaled.size();
    rerun.decisions = static_cast<std::uint64_t>(
        std::count_if(journaled.begin(), journaled.end(), [](const Event& event) { return is_decision(event.kind); }));
    rerun.done = true;
    return rerun;
}

} // namespace millpond
