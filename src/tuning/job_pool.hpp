// Jobs over threads, and a calling thread that tells how it goes. Thread: cold.
#pragma once

#include <atomic>
#include <cstddef>
#include <functional>

namespace millpond {

/// Runs `job(i)` for every i below `count` on `threads` threads; calls `meanwhile` on the calling thread every 20 ms
/// and once at the end. Jobs not begun when `stop` turns true are left out. What a job throws is thrown again here.
void run_jobs(std::size_t count, unsigned threads, const std::atomic<bool>& stop,
              const std::function<void(std::size_t)>& job, const std::function<void()>& meanwhile);

} // namespace millpond
