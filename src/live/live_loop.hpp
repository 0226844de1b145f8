// The loop of a session: a packet comes in, the engine runs over it to the end, the pulse goes out, events are handed
// on. One thread from packet to pulse. Allocates, locks, throws and formats nothing once it runs.
#pragma once

#include "arbiter/speed_gate.hpp"
#include "base/spsc_ring.hpp"
#include "control/command.hpp"
#include "engine/engine.hpp"
#include "intake/sample_source.hpp"
#include "live/emergency_stop.hpp"
#include "outputs/pulse_lines.hpp"

#include <array>
#include <atomic>

namespace millpond {

/// Where the loop leaves what it saw.  Thread: loop; allocates, locks and throws nothing.
class LoopJournal : public EventSink {
  public:
    /// The block as the engine saw it, once the engine and its pulse are done with it.
    virtual void store(const FrameBlock& block) noexcept = 0;
    /// What one packet cost; a part that was not measured is PulseDetail::not_measured.
    virtual void time_packet(std::int64_t transport_ns, std::int64_t wake_ns, std::int64_t loop_ns) noexcept = 0;
    /// Evidence was or may be lost: no more pulses.
    [[nodiscard]] virtual bool failed() const noexcept = 0;
};

struct LiveLoopSettings {
    Nanos stale_after{500'000'000};
    bool spin = false;
    bool start_armed = false;
    SpeedGateSettings speed_gate{};
};

/// Why the loop ended.
enum class LoopEnd : std::uint8_t {
    running, ///< it has not
    stopped, ///< somebody asked it to
    ended,   ///< the source has no more samples
    failed,  ///< the source broke
    planned  ///< the plan's last epoch has ended
};

class LiveLoop : private PulsePort {
  public:
    /// Everything outlives the loop. The engine is made by `make_engine(sink, port)`, since it reports to the loop.
    template <class MakeEngine>
    LiveLoop(LiveLoopSettings settings, SampleSource& source, PulseLines& lines, LoopJournal& journal,
             SpscRing<Command>& commands, MakeEngine&& make_engine)
        : settings_(settings), source_(source), lines_(lines), journal_(journal), commands_(commands),
          speed_(settings.speed_gate),
          engine_(make_engine(static_cast<EventSink&>(journal), static_cast<PulsePort&>(*this))) {}

    /// Runs until stopped or the source ends, then disarms and lets the lines fall. Thread: loop.
    void run() noexcept;

    /// Thread: any, and signal handlers.
    void stop() noexcept { stopping_.store(true, std::memory_order_relaxed); }
    [[nodiscard]] LoopEnd end() const noexcept { return end_.load(std::memory_order_acquire); }

    /// Orders the line low at once, by the calling thread; the session is faulted. Thread: control.
    void emergency_stop(const ChangedBy& by) noexcept {
        stop_.stop(by);
        lines_.fall_now();
    }
    [[nodiscard]] bool emergency_stopped() const noexcept { return stop_.stopped(); }
    /// The emergency is over; a command `clear` to the loop follows. Thread: control.
    void clear_emergency_stop() noexcept { stop_.clear(); }

    /// After `run`.
    [[nodiscard]] Engine& engine() noexcept { return engine_; }

  private:
    void fire(const Event& order) noexcept override;
    void mark(const Event& trigger) noexcept override;
    void take_commands() noexcept;
    void obey(const Command& command) noexcept;
    void look_for_trouble() noexcept;
    void take_stop() noexcept;
    void follow_speed(Nanos now) noexcept;
    void journal_speed(Nanos now) noexcept;
    void on_frames(const Arrival& arrival, Nanos began) noexcept;
    void on_silence() noexcept;
    void journal_counts() noexcept;
    [[nodiscard]] bool keep_on(Received received) noexcept;

    LiveLoopSettings settings_;
    SampleSource& source_;
    PulseLines& lines_;
    LoopJournal& journal_;
    SpscRing<Command>& commands_;
    EmergencyStop stop_;
    SpeedGate speed_;
    bool speed_open_ = false;
    std::uint64_t speeds_ = 0; // since the last event
    SampleIndex next_speed_{};
    Engine engine_;
    PacketCounts counted_{};
    std::uint64_t packets_ = 0;
    Nanos last_frames_{};
    bool stale_ = false;

    // The packet being worked on, for the parts of a pulse's latency.
    const Arrival* arrival_ = nullptr;
    Nanos began_{};
    std::int64_t wake_ns_ = 0, transport_ns_ = 0;
    bool output_failed_ = false;

    std::atomic<bool> stopping_{false};
    std::atomic<LoopEnd> end_{LoopEnd::running};
};

} // namespace millpond
