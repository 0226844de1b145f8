// How late is the fall of a pulse ordered? The pulse line against a bare thread that sleeps with clock_nanosleep to the
// same deadline, turn by turn in one run: on the computer as it is, and with a busy thread on every core. Usage:
// pulse_end_bench [PULSES]
#include "base/clock.hpp"
#include "outputs/pulse_lines.hpp"
#include "outputs/silent_output.hpp"

#include <algorithm>
#include <atomic>
#include <cstdio>
#include <cstdlib>
#include <thread>
#include <time.h>
#include <vector>

namespace {

using namespace millpond;
using Latenesses = std::vector<std::int64_t>;

constexpr Nanos width{1'000'000};
constexpr Nanos pause{4'000'000}; // from the order until the next one's turn

class Falls final : public EventSink {
  public:
    explicit Falls(std::size_t pulses) { late_ns.reserve(pulses); }
    // Thread: pulse.
    void take(const Event& event) noexcept override {
        late_ns.push_back(event.as<PulseEndDetail>().late_ns);
        seen.store(late_ns.size(), std::memory_order_release);
    }
    Latenesses late_ns;
    std::atomic<std::size_t> seen{0};
};

/// Sleeps to `width` after each order, as plainly as can be.
class BareSleeper {
  public:
    explicit BareSleeper(std::size_t pulses) {
        late_ns_.reserve(pulses);
        thread_ = std::jthread([this, pulses] { run(pulses); });
    }
    void order() noexcept {
        order_ns_.store(monotonic_now().count(), std::memory_order_relaxed);
        orders_.fetch_add(1, std::memory_order_release);
        orders_.notify_one();
    }
    const Latenesses& ended() {
        thread_.join();
        return late_ns_;
    }

  private:
    void run(std::size_t pulses) {
        for (std::size_t done = 0; done < pulses; ++done) {
            orders_.wait(done, std::memory_order_acquire);
            const Nanos deadline = Nanos{order_ns_.load(std::memory_order_relaxed)} + width;
            const timespec at{static_cast<time_t>(deadline.count() / 1'000'000'000),
                              static_cast<long>(deadline.count() % 1'000'000'000)};
            clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &at, nullptr);
            late_ns_.push_back((monotonic_now() - deadline).count());
        }
    }

    std::atomic<std::size_t> orders_{0};
    std::atomic<std::int64_t> order_ns_{0};
    Latenesses late_ns_;
    std::jthread thread_;
};

/// Busy for as long as it lives.
class Competitors {
  public:
    explicit Competitors(unsigned threads) {
        for (unsigned i = 0; i < threads; ++i) {
            threads_.emplace_back([](const std::stop_token& stop) {
                while (!stop.stop_requested()) {
                }
            });
        }
    }

  private:
    std::vector<std::jthread> threads_;
};

// Nearest rank, exact.
double micros_at(const Latenesses& sorted, double share) {
    const auto rank = static_cast<std::size_t>(share * static_cast<double>(sorted.size()) + 0.5);
    return static_cast<double>(sorted[std::clamp<std::size_t>(rank, 1, sorted.size()) - 1]) / 1000.0;
}

void print(const char* computer, const char* who, Latenesses late) {
    std::sort(late.begin(), late.end());
    std::printf("%-9s %-16s %8zu %10.1f %10.1f %10.1f %10.1f\n", computer, who, late.size(), micros_at(late, 0.5),
                micros_at(late, 0.99), micros_at(late, 0.999), micros_at(late, 1.0));
}

void measure(const char* computer, std::size_t pulses) {
    SilentOutput output;
    Falls falls(pulses);
    BareSleeper bare(pulses);
    {
        LineBoard board;
        PulseLines lines(std::vector<PulseLinePlan>{{&output, {width, 1, {}}, Follows::pulse}}, board, falls);
        for (std::size_t i = 0; i < pulses; ++i) {
            lines.rise(Follows::pulse, SampleIndex{i});
            std::this_thread::sleep_for(pause);
            while (falls.seen.load(std::memory_order_acquire) <= i) { // a train must end before the next begins
                std::this_thread::sleep_for(pause);
            }
            bare.order();
            std::this_thread::sleep_for(pause);
        }
    }
    print(computer, "pulse lines", falls.late_ns);
    print(computer, "clock_nanosleep", bare.ended());
}

} // namespace

int main(int argc, char** argv) {
    const auto pulses = argc > 1 ? std::strtoul(argv[1], nullptr, 10) : 2000UL;
    if (pulses == 0) {
        std::fprintf(stderr, "pulse_end_bench: PULSES found %s; allowed: 1 or more\n", argv[1]);
        return 2;
    }
    std::printf("fall ordered after its time, us; width 1 ms\n%-9s %-16s %8s %10s %10s %10s %10s\n", "computer", "who",
                "count", "p50", "p99", "p99.9", "max");
    measure("as it is", pulses);
    const Competitors competitors(std::thread::hardware_concurrency());
    measure("busy", pulses);
}
