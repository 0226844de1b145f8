#include "outputs/crash_guard.hpp"

#include "outputs/output_settings.hpp"

#include <algorithm>
#include <array>
#include <atomic>
#include <csignal>

namespace millpond {
namespace {

std::array<Output*, most_outputs> guarded{};
std::atomic<std::size_t> guarded_count{0};

void lower_and_die(int signal) {
    const std::size_t count = guarded_count.exchange(0, std::memory_order_acquire);
    for (std::size_t i = 0; i < count; ++i) {
        guarded[i]->set_line(false);
    }
    std::signal(signal, SIG_DFL);
    std::raise(signal);
}

} // namespace

void guard_lines_against_crashes(std::span<Output* const> outputs) {
    guarded_count.store(0, std::memory_order_relaxed);
    const std::size_t count = std::min(outputs.size(), guarded.size());
    std::copy_n(outputs.begin(), count, guarded.begin());
    guarded_count.store(count, std::memory_order_release); // publishes the array to whatever thread crashes
    struct sigaction action {};
    action.sa_handler = count > 0 ? lower_and_die : SIG_DFL;
    sigemptyset(&action.sa_mask);
    for (const int signal : {SIGSEGV, SIGBUS, SIGFPE, SIGILL, SIGABRT, SIGQUIT}) {
        sigaction(signal, &action, nullptr);
    }
}

} // namespace millpond
