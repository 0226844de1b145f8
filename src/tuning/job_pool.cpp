#include "tuning/job_pool.hpp"

#include <algorithm>
#include <chrono>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

namespace millpond {

void run_jobs(std::size_t count, unsigned threads, const std::atomic<bool>& stop,
              const std::function<void(std::size_t)>& job, const std::function<void()>& meanwhile) {
    threads = std::max(1U, std::min(threads, static_cast<unsigned>(std::min<std::size_t>(count, 256))));
    std::atomic<std::size_t> next{0};
    std::atomic<unsigned> working{threads};
    std::exception_ptr trouble;
    std::mutex trouble_lock;
    const auto work = [&] {
        for (std::size_t i = next++; i < count && !stop; i = next++) {
            try {
                job(i);
            } catch (...) {
                const std::lock_guard guard(trouble_lock);
                trouble = std::current_exception();
                next = count;
            }
        }
        --working;
    };
    {
        std::vector<std::jthread> workers;
        for (unsigned i = 0; i < threads; ++i) {
            workers.emplace_back(work);
        }
        while (working > 0) {
            meanwhile();
            std::this_thread::sleep_for(std::chrono::milliseconds(20));
        }
    }
    if (trouble) {
        std::rethrow_exception(trouble);
    }
    meanwhile();
}

} // namespace millpond
