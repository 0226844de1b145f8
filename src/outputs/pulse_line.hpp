// Raises the line from the loop and lowers it on time from a thread of its own, which also plays the rest of a train.
// The line falls when this object ends, whatever happened before.
#pragma once

#include "base/event.hpp"
#include "base/units.hpp"
#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <atomic>
#include <cstdint>
#include <thread>

namespace millpond {

struct PulseShape {
    Nanos width{1'000'000};
    std::uint32_t count = 1;
    Nanos period{10'000'000};

    /// From the first rise to the last fall.
    [[nodiscard]] Nanos length() const noexcept { return period * (count - 1) + width; }
};

/// Refuses a train whose pulses would overlap.
[[nodiscard]] PulseShape pulse_shape(const OutputSettings& settings);

class PulseLine {
  public:
    /// Orders the line low and starts the pulse thread; `ends` takes a pulse_end event for every pulse, from that
    /// thread. `priority`: SCHED_FIFO priority of the thread, 0 for the ordinary scheduler. Thread: control.
    PulseLine(Output& output, PulseShape shape, EventSink& ends, int priority = 0);
    ~PulseLine();
    PulseLine(const PulseLine&) = delete;
    PulseLine& operator=(const PulseLine&) = delete;

    /// Orders the line high now and its fall on time. Must not be called while a train is being played: the arbiter's
    /// lock-out is longer. False: the output refused. Thread: loop; one system call to the device, one to wake.
    bool rise(SampleIndex trigger) noexcept;

    /// Orders the line low at once and plays no more of a train. Thread: any.
    void fall_now() noexcept;

    /// An order that the pulse thread gave did not get through.
    [[nodiscard]] bool failed() const noexcept { return failed_.load(std::memory_order_relaxed); }
    /// Whoever arms again says that the fault is mended. Thread: any.
    void mended() noexcept { failed_.store(false, std::memory_order_relaxed); }

  private:
    void play();
    void play_train(SampleIndex trigger, Nanos start) noexcept;
    bool sleep_until(Nanos when) noexcept;

    Output& output_;
    PulseShape shape_;
    EventSink& ends_;
    // The loop writes the two places, then counts `trains_` up with release; the pulse thread meets it with acquire.
    std::atomic<std::uint64_t> trigger_{0};
    std::atomic<std::int64_t> start_ns_{0};
    std::atomic<std::uint32_t> trains_{0};
    std::atomic<bool> stopping_{false};
    std::atomic<bool> falling_{false};
    std::atomic<bool> failed_{false};
    std::jthread thread_;
};

/// Makes crashes (abort, segmentation fault and their like) order the line low before the program dies. One line at a
/// time; null takes the guard away. Thread: control.
void guard_line_against_crashes(Output* output);

} // namespace millpond
