#include "outputs/pulse_lines.hpp"

#include "base/clock.hpp"

#include <climits>

#include <algorithm>
#include <linux/futex.h>
#include <pthread.h>
#include <sys/prctl.h>
#include <sys/syscall.h>
#include <unistd.h>

namespace millpond {
namespace {

// How long before a deadline sleeping turns into watching the clock: an ordinary sleep ends about this late. Measured
// by bench/pulse_end_bench on 2 cores shared with a dozen compilers: with it half of the falls are ordered within 0.4
// us of their time, by a bare clock_nanosleep within 121 us. At p99 both were 7 ms late: that is the scheduler's share.
constexpr Nanos watch_before{80'000};

} // namespace

PulseLines::PulseLines(std::span<const PulseLinePlan> plans, LineBoard& board, EventSink& ends, int priority)
    : board_(board), ends_(ends), held_known_(board.held()) {
    for (const auto& plan : plans) {
        auto& line = lines_.emplace_back();
        line.output = plan.output;
        line.shape = plan.shape;
        line.follows = plan.follows;
        line.only = plan.only;
        line.number = static_cast<std::uint16_t>(lines_.size() - 1);
        line.output->set_line(false);
    }
    thread_ = std::jthread([this] { play(); });
    if (priority > 0) {
        sched_param wanted{};
        wanted.sched_priority = priority;
        pthread_setschedparam(thread_.native_handle(), SCHED_FIFO, &wanted);
    }
}

PulseLines::~PulseLines() {
    fall_now();
    stopping_.store(true, std::memory_order_relaxed);
    wake();
    thread_.join();
    for (auto& line : lines_) {
        order(line, false);
    }
}

bool PulseLines::rise(Follows what, SampleIndex trigger, std::uint8_t condition) noexcept {
    bool written = true;
    for (auto& line : lines_) {
        if (line.follows == what && (line.only == any_condition || line.only == condition)) {
            written = order(line, true) && written;
            line.trigger.store(trigger.value, std::memory_order_relaxed);
            line.start_ns.store(monotonic_now().count(), std::memory_order_relaxed);
            line.falling.store(false, std::memory_order_relaxed);
            line.trains.fetch_add(1, std::memory_order_release);
        }
    }
    wake();
    return written;
}

void PulseLines::fall_now() noexcept {
    for (auto& line : lines_) {
        line.falling.store(true, std::memory_order_relaxed);
        order(line, false);
    }
    wake();
}

std::optional<StateCause> PulseLines::trouble() const noexcept {
    if (board_.held() != held_known_.load(std::memory_order_relaxed)) {
        return StateCause::line_held;
    }
    const auto is_lost = [](const Line& line) { return line.lost.load(std::memory_order_relaxed); };
    if (failed_.load(std::memory_order_relaxed) || std::any_of(lines_.begin(), lines_.end(), is_lost)) {
        return StateCause::output_failed;
    }
    if (!watched_.load(std::memory_order_relaxed) || was_unwatched_.load(std::memory_order_relaxed)) {
        return StateCause::watchdog_lost;
    }
    return std::nullopt;
}

void PulseLines::mended() noexcept {
    failed_.store(false, std::memory_order_relaxed);
    was_unwatched_.store(false, std::memory_order_relaxed);
    held_known_.store(board_.held(), std::memory_order_relaxed);
}

void PulseLines::set_lost(std::size_t line, bool lost) noexcept {
    lines_[line].lost.store(lost, std::memory_order_relaxed);
    if (lost) {
        failed_.store(true, std::memory_order_relaxed);
    }
}

void PulseLines::set_watched(bool watched) noexcept {
    watched_.store(watched, std::memory_order_relaxed);
    if (!watched) {
        was_unwatched_.store(true, std::memory_order_relaxed);
    }
}

bool PulseLines::order(Line& line, bool high) noexcept {
    if (high) {
        board_.rises(line.number);
        return line.output->set_line(true);
    }
    // Where the order does not get through the board keeps the time: the watchdog goes on trying.
    const bool written = line.output->set_line(false);
    if (written) {
        board_.fell(line.number);
    }
    return written;
}

void PulseLines::play() {
    prctl(PR_SET_TIMERSLACK, 1); // the kernel may else end any sleep 50 us late
    while (!stopping_.load(std::memory_order_relaxed)) {
        const std::uint32_t seen = orders_.load(std::memory_order_acquire);
        std::optional<Nanos> next;
        for (auto& line : lines_) {
            if (const auto due = play_line(line)) {
                next = next ? std::min(*next, *due) : *due;
            }
        }
        wait(seen, next);
    }
    for (auto& line : lines_) {
        play_line(line);
    }
}

// Plays what is due; gives the time of the next edge.
std::optional<Nanos> PulseLines::play_line(Line& line) noexcept {
    take_train(line);
    while (line.edge < line.edges) {
        const bool falling = line.falling.load(std::memory_order_relaxed);
        if (!falling && monotonic_now() < line.due()) {
            return line.due();
        }
        play_edge(line);
        line.edge = falling ? line.edges : line.edge + 1;
    }
    return std::nullopt;
}

void PulseLines::take_train(Line& line) noexcept {
    if (const auto ordered = line.trains.load(std::memory_order_acquire); ordered != line.trains_taken) {
        line.trains_taken = ordered;
        line.at = SampleIndex{line.trigger.load(std::memory_order_relaxed)};
        line.start = line.rose = Nanos{line.start_ns.load(std::memory_order_relaxed)};
        line.edge = 1; // the loop itself ordered the first rise
        line.edges = 2 * line.shape.count;
    }
}

void PulseLines::play_edge(Line& line) noexcept {
    const bool rises = line.edge % 2 == 0;
    if (rises && (line.falling.load(std::memory_order_relaxed) || trouble())) {
        line.edge = line.edges; // a line that was lowered for a reason must not rise by itself
        return;
    }
    if (!order(line, rises)) {
        failed_.store(true, std::memory_order_relaxed);
    }
    const Nanos now = monotonic_now();
    if (rises) {
        line.rose = now;
        return;
    }
    Event end = Event::make(EventKind::pulse_end, 0, line.at,
                            PulseEndDetail{(now - line.rose).count(), (now - line.due()).count(), line.number,
                                           static_cast<std::uint16_t>(line.follows == Follows::trigger ? 1 : 0)});
    end.time_ns = realtime_now().count();
    ends_.take(end);
}

// Sleeps most of the way to `next`, less where anything is ordered meanwhile; the caller watches the clock for the
// rest.
void PulseLines::wait(std::uint32_t seen, std::optional<Nanos> next) noexcept {
    if (next && *next - monotonic_now() <= watch_before) {
        return;
    }
    timespec until{};
    if (next) {
        const auto at = (*next - watch_before).count();
        until = {static_cast<time_t>(at / 1'000'000'000), static_cast<long>(at % 1'000'000'000)};
    }
    static_assert(sizeof orders_ == sizeof(std::uint32_t));
    syscall(SYS_futex, &orders_, FUTEX_WAIT_BITSET_PRIVATE, seen, next ? &until : nullptr, nullptr,
            FUTEX_BITSET_MATCH_ANY);
}

void PulseLines::wake() noexcept {
    orders_.fetch_add(1, std::memory_order_release);
    syscall(SYS_futex, &orders_, FUTEX_WAKE_PRIVATE, INT_MAX, nullptr, nullptr, 0);
}

} // namespace millpond
