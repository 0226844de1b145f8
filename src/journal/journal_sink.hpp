// One producer's way into the journal.
#pragma once

#include "base/clock.hpp"
#include "base/event.hpp"
#include "base/spsc_ring.hpp"

namespace millpond {

/// `code` of a dropped event: what was dropped. Its sample is where the first of the dropped frames lies, else the last
/// place known. Values are part of the session format.
enum class Dropped : std::uint8_t {
    events = 0, ///< the record of decisions has a hole
    frames = 1, ///< of stored samples: the file ends there, or has NaN where the engine saw signal
    timings = 2 ///< of packets: the latency histograms lack them
};

/// What one packet cost. A part that was not measured is PulseDetail::not_measured.
struct PacketTiming {
    std::int64_t transport_ns; ///< sent to arrived
    std::int64_t wake_ns;      ///< arrived to loop begins on it
    std::int64_t loop_ns;      ///< arrived to loop done with it
};

/// Stamps events with the time and pushes them.  Thread: `take` from one, `pop` from the journal.
class JournalSink final : public EventSink {
  public:
    explicit JournalSink(std::size_t capacity) : ring_(capacity) {}

    /// Stamps with this computer's UTC where `time_ns` is 0. A full ring drops and counts.
    void take(const Event& event) noexcept override {
        auto stamped = event;
        if (stamped.time_ns == 0) {
            stamped.time_ns = realtime_now().count();
        }
        ring_.push(stamped);
    }

    bool pop(Event& event) noexcept { return ring_.pop(event); }
    [[nodiscard]] std::uint64_t dropped() const noexcept { return ring_.dropped(); }

  private:
    SpscRing<Event> ring_;
};

} // namespace millpond
