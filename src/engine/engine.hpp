// The one engine of every command: detector, arbiter and pulse plan; samples and commands in, events and pulse orders
// out. Live, dry run, tuning and audit differ only in where samples come from and where orders go.
#pragma once

#include "arbiter/arbiter.hpp"
#include "arbiter/pulse_plan.hpp"
#include "base/channels.hpp"
#include "base/event.hpp"
#include "base/frames.hpp"
#include "detector/detector.hpp"

#include <string_view>
#include <vector>

namespace millpond {

/// Takes the order for a pulse the moment it is decided, before anything is journaled.  Thread: loop.
class PulsePort {
  public:
    virtual ~PulsePort() = default;
    /// `order`: of kind order, at the sample that decided.
    virtual void fire(const Event& order) noexcept = 0;
    /// A trigger, in every condition, after its pulse where it has one at once: for lines that mark triggers.
    virtual void mark(const Event& /*trigger*/) noexcept {}
};

/// For runs without a line: every order is forgotten.
class NoPulsePort : public PulsePort {
  public:
    void fire(const Event& /*order*/) noexcept override {}
};

struct EngineSettings {
    DetectorSettings detector;
    ArbiterSettings arbiter;

    bool operator==(const EngineSettings&) const = default;
};

/// Thread: one, whoever owns it (the loop, in a session). After make nothing here allocates, locks, throws or formats.
class Engine {
  public:
    /// Emits nothing yet. Allocates: where the detector has a gate of its own, the arbiter hears of it here. The engine
    /// keeps references to `sink` and `port`; they must outlive it.
    /// `schedule`: places of a control schedule in ascending order, empty without one.
    Engine(Detector detector, const ArbiterSettings& arbiter, std::vector<SampleIndex> schedule, Hertz rate,
           EventSink& sink, PulsePort& port);

    /// Conditions by an assignment; `block_frames`: a block begins each time, 0: units begin with `next_trial`. Before
    /// `start`. Allocates.
    void assign(std::vector<Condition> list, std::uint64_t block_frames) {
        plan_.assign(std::move(list));
        block_frames_ = block_frames;
    }

    /// First call of a session or run: emits the starting state and the gates. `armed`: start armed.
    void start(SampleIndex at, bool armed) noexcept;

    /// Runs over a block. Frames missing between the end of the last block and the start of this one are taken as a gap
    /// of `cause`. Frames with a non-finite value on a used channel are taken as a gap of their own.
    void process(const FrameBlock& block, GapCause cause = GapCause::packet_loss) noexcept;

    /// Last call: a gap that was still open at the end of the samples is emitted.
    void finish() noexcept { close_gap(); }

    /// Commands take effect before the next frame, `next_sample()`, and are journaled there.
    /// `by` says who; where it does not, the cause does.
    void set_state(ArmState state, StateCause cause, const ChangedBy& by = {}) noexcept;
    /// False, and nothing happens, where no gate has that name that commands may move: the detector's own is not one.
    bool set_gate(std::string_view name, bool open, const ChangedBy& by = {ChangeSource::command}) noexcept;
    /// The plan's next epoch begins, whether or not the present one has a length. Nothing happens after the last one.
    void next_epoch(const ChangedBy& by) noexcept;
    /// The next trial of the assignment begins with the next frame.
    void next_trial() noexcept { begin_unit(); }
    /// The operator's text into the journal, cut into as many note events as it needs.
    void note(std::string_view text) noexcept;

    [[nodiscard]] SampleIndex next_sample() const noexcept { return next_; }
    [[nodiscard]] Detector& detector() noexcept { return detector_; }
    [[nodiscard]] const Detector& detector() const noexcept { return detector_; }
    [[nodiscard]] const Arbiter& arbiter() const noexcept { return arbiter_; }
    [[nodiscard]] const PulsePlan& plan() const noexcept { return plan_; }
    [[nodiscard]] std::uint64_t detections() const noexcept { return detections_; }

  private:
    void run_finite(FrameBlock block) noexcept;
    std::size_t run_detector(const FrameBlock& block) noexcept;
    [[nodiscard]] std::size_t broken_frames(const FrameBlock& block, std::size_t from) const noexcept;
    void on_crossing(const Crossing& crossing) noexcept;
    [[nodiscard]] Event order_event(SampleIndex at, TriggerDetail detail) const noexcept;
    void begin_unit() noexcept;
    void begin_blocks() noexcept;
    void meet_slot() noexcept;
    void miss_slots(SampleIndex before) noexcept;
    void skip(std::uint64_t frames, GapCause cause) noexcept;
    void close_gap() noexcept;
    void journal_floors() noexcept;
    void follow_state() noexcept;
    void follow_plan(SampleIndex upto) noexcept;
    void follow_watch() noexcept;
    void begin_epoch(SampleIndex at, const ChangedBy& by) noexcept;
    void move_gate(std::string_view name, bool open, const ChangedBy& by) noexcept;
    void journal_gate(std::string_view name, bool open, const ChangedBy& by) noexcept;

    Detector detector_;
    Arbiter arbiter_;
    PulsePlan plan_;
    EventSink& sink_;
    PulsePort& port_;
    std::uint64_t second_frames_;
    std::uint64_t block_frames_ = 0;
    SampleIndex next_block_{UINT64_MAX};
    SampleIndex next_{};
    SampleIndex next_floor_{};
    // Missing frames in a row are one gap however they came in: it is emitted when the next good frame comes.
    SampleIndex gap_from_{};
    std::uint64_t gap_frames_ = 0;
    GapCause gap_cause_{};
    std::uint64_t detections_ = 0;
};

} // namespace millpond
