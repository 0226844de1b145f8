#include "outputs/pulse_line.hpp"

#include "base/clock.hpp"
#include "base/refusal.hpp"

#include <algorithm>
#include <csignal>
#include <pthread.h>
#include <string>
#include <sys/prctl.h>

namespace millpond {
namespace {

// How long before a deadline sleeping turns into watching the clock: an ordinary sleep ends about this late. Measured
// by bench/pulse_end_bench on 2 cores shared with a dozen compilers: with it half of the falls are ordered within 0.4
// us of their time, by a bare clock_nanosleep within 121 us. At p99 both were 7 ms late: that is the scheduler's share.
constexpr Nanos watch_before{80'000};

std::atomic<Output*> guarded{nullptr};

void lower_and_die(int signal) {
    if (Output* output = guarded.exchange(nullptr)) {
        output->set_line(false);
    }
    std::signal(signal, SIG_DFL);
    std::raise(signal);
}

} // namespace

PulseShape pulse_shape(const OutputSettings& settings) {
    const auto nanos = [](double ms) { return Nanos{static_cast<std::int64_t>(ms * 1e6)}; };
    if (settings.train_pulses > 1 && settings.train_period_ms <= settings.width_ms) {
        throw Refusal("output.train_period_ms", std::to_string(settings.train_period_ms),
                      "more than width_ms, " + std::to_string(settings.width_ms));
    }
    return {nanos(settings.width_ms), settings.train_pulses, nanos(settings.train_period_ms)};
}

PulseLine::PulseLine(Output& output, PulseShape shape, EventSink& ends, int priority)
    : output_(output), shape_(shape), ends_(ends) {
    output_.set_line(false);
    thread_ = std::jthread([this] { play(); });
    if (priority > 0) {
        sched_param wanted{};
        wanted.sched_priority = priority;
        pthread_setschedparam(thread_.native_handle(), SCHED_FIFO, &wanted);
    }
}

PulseLine::~PulseLine() {
    stopping_.store(true, std::memory_order_relaxed);
    trains_.fetch_add(1, std::memory_order_release);
    trains_.notify_one();
    thread_.join();
    output_.set_line(false);
}

bool PulseLine::rise(SampleIndex trigger) noexcept {
    const bool written = output_.set_line(true);
    trigger_.store(trigger.value, std::memory_order_relaxed);
    start_ns_.store(monotonic_now().count(), std::memory_order_relaxed);
    falling_.store(false, std::memory_order_relaxed);
    trains_.fetch_add(1, std::memory_order_release);
    trains_.notify_one();
    return written;
}

void PulseLine::fall_now() noexcept {
    falling_.store(true, std::memory_order_relaxed);
    output_.set_line(false);
}

void PulseLine::play() {
    prctl(PR_SET_TIMERSLACK, 1); // the kernel may else end any sleep 50 us late
    std::uint32_t played = 0;
    while (!stopping_.load(std::memory_order_relaxed)) {
        trains_.wait(played, std::memory_order_acquire);
        const std::uint32_t ordered = trains_.load(std::memory_order_acquire);
        if (ordered != played && !stopping_.load(std::memory_order_relaxed)) {
            play_train(SampleIndex{trigger_.load(std::memory_order_relaxed)},
                       Nanos{start_ns_.load(std::memory_order_relaxed)});
        }
        played = ordered;
    }
}

void PulseLine::play_train(SampleIndex trigger, Nanos start) noexcept {
    Nanos rose = start;
    for (std::uint32_t i = 0; i < shape_.count; ++i) {
        const Nanos planned_rise = start + shape_.period * i;
        if (i > 0) {
            if (!sleep_until(planned_rise)) {
                return;
            }
            if (!output_.set_line(true)) {
                failed_.store(true, std::memory_order_relaxed);
            }
            rose = monotonic_now();
        }
        const Nanos planned_fall = planned_rise + shape_.width;
        sleep_until(planned_fall);
        if (!output_.set_line(false)) {
            failed_.store(true, std::memory_order_relaxed);
        }
        const Nanos fell = monotonic_now();
        Event end = Event::make(EventKind::pulse_end, 0, trigger,
                                PulseEndDetail{(fell - rose).count(), (fell - planned_fall).count()});
        end.time_ns = realtime_now().count();
        ends_.take(end);
    }
}

// Sleeps most of the way and watches the clock for the rest. False: told to let the line fall before `when`.
bool PulseLine::sleep_until(Nanos when) noexcept {
    constexpr Nanos step{2'000'000}; // how soon an order to fall is noticed
    for (Nanos now = monotonic_now(); now < when; now = monotonic_now()) {
        if (stopping_.load(std::memory_order_relaxed) || falling_.load(std::memory_order_relaxed)) {
            return false;
        }
        if (when - now > watch_before) {
            const Nanos until = std::min(when - watch_before, now + step);
            const timespec at{static_cast<time_t>(until.count() / 1'000'000'000),
                              static_cast<long>(until.count() % 1'000'000'000)};
            clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &at, nullptr);
        }
    }
    return true;
}

void guard_line_against_crashes(Output* output) {
    guarded.store(output);
    struct sigaction action {};
    action.sa_handler = output != nullptr ? lower_and_die : SIG_DFL;
    sigemptyset(&action.sa_mask);
    for (const int signal : {SIGSEGV, SIGBUS, SIGFPE, SIGILL, SIGABRT, SIGQUIT}) {
        sigaction(signal, &action, nullptr);
    }
}

} // namespace millpond
