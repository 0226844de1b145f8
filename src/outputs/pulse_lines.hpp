// Raises the lines from the loop and lowers them on time from one thread of its own, which also plays the rest of
// trains. Every line falls when this object ends, whatever happened before.
#pragma once

#include "base/event.hpp"
#include "outputs/line_board.hpp"
#include "outputs/output.hpp"
#include "outputs/pulse_shape.hpp"

#include <atomic>
#include <cstdint>
#include <deque>
#include <optional>
#include <span>
#include <thread>

namespace millpond {

/// In place of a number of a condition.
inline constexpr std::uint8_t any_condition = 255;

struct PulseLinePlan {
    Output* output = nullptr;
    PulseShape shape;
    Follows follows = Follows::pulse;
    std::uint8_t only = any_condition; ///< of follows pulse: the one condition whose pulses raise it
};

class PulseLines {
  public:
    /// Orders every line low and starts the pulse thread; `ends` takes a pulse_end event for every pulse of every line,
    /// from that thread. Outputs, board and ends outlive it; at most most_outputs lines. `priority`: SCHED_FIFO
    /// priority of the thread, 0 for the ordinary scheduler. Thread: control.
    PulseLines(std::span<const PulseLinePlan> plans, LineBoard& board, EventSink& ends, int priority = 0);
    ~PulseLines();
    PulseLines(const PulseLines&) = delete;
    PulseLines& operator=(const PulseLines&) = delete;

    /// `condition`: that of the pulse. Orders every line that follows `what` high now, in the order of settings, and
    /// their falls on time. Must not be called while such a line plays a train: the arbiter's lock-out is longer.
    /// False: an output refused. Thread: loop; one system call a line, and one to wake.
    bool rise(Follows what, SampleIndex trigger, std::uint8_t condition = any_condition) noexcept;

    /// Orders every line low at once and plays no more of any train. Thread: any.
    void fall_now() noexcept;

    /// Why no pulse may be given; empty where nothing is wrong. Thread: any.
    [[nodiscard]] std::optional<StateCause> trouble() const noexcept;
    /// Whoever arms again says that orders that failed and lines that were held are known. What still is wrong stays
    /// so. Thread: any.
    void mended() noexcept;

    // What the control thread knows of devices and watchdog. Thread: control.
    void set_lost(std::size_t line, bool lost) noexcept;
    void set_watched(bool watched) noexcept;

  private:
    struct Line {
        Output* output = nullptr;
        PulseShape shape;
        Follows follows{};
        std::uint8_t only = any_condition;
        std::uint16_t number = 0;

        // The loop writes the two places, then counts `trains` up with release; the pulse thread meets it with acquire.
        std::atomic<std::uint64_t> trigger{0};
        std::atomic<std::int64_t> start_ns{0};
        std::atomic<std::uint32_t> trains{0};
        std::atomic<bool> falling{false};
        std::atomic<bool> lost{false};

        // The train being played. Thread: pulse.
        std::uint32_t trains_taken = 0;
        std::uint32_t edge = 0, edges = 0; // next and last; odd ones fall
        SampleIndex at;
        Nanos start{}, rose{};

        [[nodiscard]] Nanos due() const noexcept {
            return start + shape.period * (edge / 2) + (edge % 2 == 1 ? shape.width : Nanos{0});
        }
    };

    void play();
    std::optional<Nanos> play_line(Line& line) noexcept;
    void take_train(Line& line) noexcept;
    void play_edge(Line& line) noexcept;
    bool order(Line& line, bool high) noexcept;
    void wait(std::uint32_t seen, std::optional<Nanos> next) noexcept;
    void wake() noexcept;

    LineBoard& board_;
    EventSink& ends_;
    std::deque<Line> lines_;
    std::atomic<std::uint32_t> orders_{0}; // counted up at whatever the pulse thread must look at
    std::atomic<bool> stopping_{false};
    std::atomic<bool> failed_{false};
    std::atomic<bool> watched_{true};
    std::atomic<bool> was_unwatched_{false}; // until somebody arms again
    std::atomic<std::uint32_t> held_known_{0};
    std::jthread thread_;
};

} // namespace millpond
