#include "app/stop_signals.hpp"

namespace millpond {
namespace {

volatile std::sig_atomic_t wish = 0;

void note_wish(int /*signal*/) {
    wish = 1;
}

} // namespace

StopSignals::StopSignals() {
    wish = 0;
    struct sigaction once {};
    once.sa_handler = note_wish;
    once.sa_flags = static_cast<int>(SA_RESETHAND);
    sigaction(SIGINT, &once, &interrupt_before_);
    sigaction(SIGTERM, &once, &terminate_before_);
}

StopSignals::~StopSignals() {
    sigaction(SIGINT, &interrupt_before_, nullptr);
    sigaction(SIGTERM, &terminate_before_, nullptr);
}

bool StopSignals::wished() noexcept {
    return wish != 0;
}

} // namespace millpond
