#include "app/progress.hpp"

#include <fmt/format.h>

#include <cstdio>
#include <unistd.h>

namespace millpond {

using namespace std::chrono_literals;

Progress::Progress(std::string what, double total)
    : what_(std::move(what)), total_(total), terminal_(isatty(STDERR_FILENO) == 1), start_(Clock::now()),
      next_print_(start_ + 2s) {}

Progress::~Progress() {
    if (printed_ && terminal_) {
        fmt::print(stderr, "\n");
    }
}

void Progress::at(double done) {
    const auto now = Clock::now();
    if (now < next_print_) {
        return;
    }
    // A terminal's line is written over; a log gets a line now and then.
    next_print_ = now + (terminal_ ? 500ms : 10000ms);
    printed_ = true;
    const double passed = std::chrono::duration<double>(now - start_).count();
    const auto left = total_ > 0.0 && done > 0.0 ? fmt::format("{:3.0f} %, {:.0f} s left", 100.0 * done / total_,
                                                               passed * (total_ / done - 1.0))
                                                 : fmt::format("{:.0f} s so far", passed);
    fmt::print(stderr, "{}{}: {}{}", terminal_ ? "\r" : "", what_, left, terminal_ ? "    " : "\n");
    std::fflush(stderr);
}

} // namespace millpond
