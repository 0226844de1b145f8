#include "realtime/fitness.hpp"

#include "base/clock.hpp"
#include "base/histogram.hpp"
#include "base/refusal.hpp"
#include "realtime/realtime.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cstring>
#include <fcntl.h>
#include <fstream>
#include <mutex>
#include <sys/mman.h>
#include <sys/timex.h>
#include <unistd.h>

namespace millpond {
namespace {

std::string first_line(const char* file) {
    std::ifstream in(file);
    std::string line;
    std::getline(in, line);
    return line;
}

// Runs `work` on a thread with the loop's rights; empty where they cannot be had.
template <class Work> std::string on_realtime_thread(const RealtimeSettings& settings, Work work) {
    std::mutex gate;
    std::unique_lock held(gate);
    bool go = false;
    std::thread thread([&] {
        const std::scoped_lock wait(gate);
        if (go) {
            work();
        }
    });
    std::string trouble;
    try {
        make_realtime(thread, settings);
        go = true;
    } catch (const Refusal& refusal) {
        trouble = refusal.what();
    }
    held.unlock();
    thread.join();
    return trouble;
}

} // namespace

std::vector<Finding> check_rights(const RealtimeSettings& settings) {
    std::vector<Finding> findings;
    const auto trouble = on_realtime_thread(settings, [] {});
    if (!trouble.empty()) {
        findings.push_back({Fitness::bad, "real-time rights", trouble});
    } else if (settings.priority == 0) {
        findings.push_back({Fitness::caution, "real-time rights",
                            "not asked for: the loop shares the scheduler with everything else (realtime.priority)"});
    } else {
        findings.push_back(
            {Fitness::good, "real-time rights", fmt::format("SCHED_FIFO priority {} granted", settings.priority)});
    }
    if (!settings.lock_memory) {
        findings.push_back({Fitness::caution, "memory lock",
                            "not asked for: a page may be fetched from disk in mid-loop (realtime.lock_memory)"});
    } else if (mlockall(MCL_CURRENT | MCL_FUTURE) != 0) {
        findings.push_back(
            {Fitness::bad, "memory lock", fmt::format("{}; raise this user's memlock limit", std::strerror(errno))});
    } else {
        munlockall();
        findings.push_back({Fitness::good, "memory lock", "granted"});
    }
    return findings;
}

Finding check_throttling(const RealtimeSettings& settings) {
    const auto runtime = first_line("/proc/sys/kernel/sched_rt_runtime_us");
    const auto period = first_line("/proc/sys/kernel/sched_rt_period_us");
    const bool trap = settings.spin && settings.priority > 0 && runtime != "-1" && runtime != period;
    const auto found = fmt::format("real-time threads may run {} of every {} us", runtime, period);
    if (trap) {
        return {Fitness::bad, "throttling",
                found + ": a spinning loop at real-time priority is stopped for the rest; set realtime.spin: false, or "
                        "sysctl kernel.sched_rt_runtime_us=-1"};
    }
    return {Fitness::good, "throttling", found + (settings.spin ? "" : "; the loop sleeps between packets")};
}

std::vector<Finding> check_clock() {
    std::vector<Finding> findings;
    const auto source = first_line("/sys/devices/system/clocksource/clocksource0/current_clocksource");
    const bool quick = source == "tsc" || source == "kvm-clock" || source == "arch_sys_counter";
    findings.push_back({quick ? Fitness::good : Fitness::caution, "clock source",
                        source.empty() ? "unknown" : source + (quick ? "" : ": slow to read; tsc is better")});
    timex state{};
    const int status = adjtimex(&state);
    if (status < 0) {
        findings.push_back({Fitness::caution, "clock discipline", std::strerror(errno)});
    } else if (status == TIME_ERROR) {
        findings.push_back(
            {Fitness::caution, "clock discipline",
             "not synchronised: transport latency from another computer means nothing (run an NTP or PTP client)"});
    } else {
        findings.push_back(
            {Fitness::good, "clock discipline", fmt::format("synchronised, estimated error {} us", state.esterror)});
    }
    return findings;
}

Finding check_wake(const RealtimeSettings& settings, double seconds) {
    LatencyHistogram late;
    const auto trouble = on_realtime_thread(settings, [&] {
        constexpr Nanos period{1'000'000};
        Nanos due = monotonic_now() + period;
        for (const Nanos end = due + Nanos{static_cast<std::int64_t>(seconds * 1e9)}; due < end; due += period) {
            const timespec at{static_cast<time_t>(due.count() / 1'000'000'000),
                              static_cast<long>(due.count() % 1'000'000'000)};
            clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &at, nullptr);
            late.add((monotonic_now() - due).count());
        }
    });
    if (!trouble.empty()) {
        return {Fitness::bad, "wake", "not measured: " + trouble};
    }
    const auto us = [](std::int64_t ns) { return static_cast<double>(ns) / 1000.0; };
    const auto found =
        fmt::format("late by p50 {:.0f}, p99 {:.0f}, max {:.0f} us over {} wakes", us(late.quantile_ns(0.5)),
                    us(late.quantile_ns(0.99)), us(late.max_ns()), late.count());
    // 1 ms is a whole packet of most rigs; 'common practice'.
    const bool slow = late.quantile_ns(0.99) > 1'000'000;
    return {slow ? Fitness::caution : Fitness::good, "wake",
            found + (slow ? ": busy computer; close other programs, or ask for realtime.priority" : "")};
}

std::vector<Finding> check_disk(const std::filesystem::path& folder, double bytes_per_second, double min_free_mb) {
    auto existing = std::filesystem::absolute(folder);
    while (!std::filesystem::exists(existing)) {
        existing = existing.parent_path();
    }
    const double free_mb = static_cast<double>(std::filesystem::space(existing).available) / 1e6;
    const double hours = (free_mb - min_free_mb) * 1e6 / bytes_per_second / 3600.0;
    std::vector<Finding> findings;
    const auto space = fmt::format("{:.0f} MB free in {}, enough for {:.1f} h of this stream", free_mb,
                                   existing.string(), std::max(hours, 0.0));
    findings.push_back({hours <= 0.0  ? Fitness::bad
                        : hours < 4.0 ? Fitness::caution
                                      : Fitness::good,
                        "disk space", space + (hours < 4.0 ? ": make room" : "")});

    const auto file = existing / (".millpond_disk_check_" + std::to_string(getpid()));
    const int descriptor = open(file.c_str(), O_CREAT | O_EXCL | O_WRONLY | O_CLOEXEC, 0600);
    if (descriptor < 0) {
        findings.push_back({Fitness::bad, "disk speed",
                            fmt::format("cannot write in {}: {}", existing.string(), std::strerror(errno))});
        return findings;
    }
    const std::vector<char> chunk(1 << 20, 'm');
    const Nanos began = monotonic_now();
    bool written = true;
    for (int i = 0; i < 32 && written; ++i) {
        written = write(descriptor, chunk.data(), chunk.size()) == static_cast<ssize_t>(chunk.size());
    }
    written = fdatasync(descriptor) == 0 && written;
    const double took_s = static_cast<double>((monotonic_now() - began).count()) / 1e9;
    close(descriptor);
    std::filesystem::remove(file);
    const double times = 32.0 * 1048576.0 / took_s / bytes_per_second;
    findings.push_back(
        {!written || times < 2.0 ? Fitness::bad
         : times < 10.0          ? Fitness::caution
                                 : Fitness::good,
         "disk speed",
         written ? fmt::format("{:.0f} times what the stream brings", times) : "a test file could not be written"});
    return findings;
}

} // namespace millpond
