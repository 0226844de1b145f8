#include "realtime/realtime.hpp"

#include "base/refusal.hpp"

#include <cstring>
#include <pthread.h>
#include <string>
#include <sys/mman.h>

namespace millpond {

void make_realtime(std::thread& thread, const RealtimeSettings& settings) {
    if (settings.priority > 0) {
        sched_param wanted{};
        wanted.sched_priority = settings.priority;
        if (const int trouble = pthread_setschedparam(thread.native_handle(), SCHED_FIFO, &wanted); trouble != 0) {
            throw Refusal("realtime.priority", std::to_string(settings.priority) + " (" + std::strerror(trouble) + ")",
                          "0, or a user with an rtprio limit of at least that (limits.conf)");
        }
    }
    if (settings.core >= 0) {
        cpu_set_t cores;
        CPU_ZERO(&cores);
        CPU_SET(static_cast<std::size_t>(settings.core), &cores);
        if (const int trouble = pthread_setaffinity_np(thread.native_handle(), sizeof cores, &cores); trouble != 0) {
            throw Refusal("realtime.core", std::to_string(settings.core) + " (" + std::strerror(trouble) + ")",
                          "-1, or a core of this computer, 0 to " +
                              std::to_string(std::thread::hardware_concurrency() - 1));
        }
    }
}

void lock_memory(const RealtimeSettings& settings) {
    if (settings.lock_memory && mlockall(MCL_CURRENT | MCL_FUTURE) != 0) {
        throw Refusal("realtime.lock_memory", std::string("true (") + std::strerror(errno) + ")",
                      "false, or a user with a memlock limit of unlimited (limits.conf)");
    }
}

} // namespace millpond
