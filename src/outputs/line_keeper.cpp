#include "outputs/line_keeper.hpp"

#include <exception>

namespace millpond {
namespace {

constexpr Nanos look_every = std::chrono::milliseconds{100};
constexpr Nanos try_every = std::chrono::seconds{1};

} // namespace

LineKeeper::LineKeeper(std::vector<WatchedLine> lines, LineBoard& board, WatchdogSettings settings)
    : lines_(std::move(lines)), devices_(lines_.size()), board_(board), settings_(settings),
      watchdog_(std::make_unique<Watchdog>(lines_, board_, settings_)) {}

void LineKeeper::look(PulseLines& pulses, const Tell& tell) {
    if (monotonic_now() - looked_at_ >= look_every) {
        looked_at_ = monotonic_now();
        for (std::size_t line = 0; line < lines_.size(); ++line) {
            look_at(line, pulses, tell);
        }
    }
    look_at_watchdog(pulses, tell);
}

void LineKeeper::look_at(std::size_t line, PulseLines& pulses, const Tell& tell) {
    auto& device = devices_[line];
    auto& output = *lines_[line].output;
    if (!device.lost && !output.answers()) {
        device.lost = true;
        device.tried_at = monotonic_now();
        pulses.set_lost(line, true);
        tell.device(line, DeviceState::lost);
    } else if (device.lost && monotonic_now() - device.tried_at >= try_every) {
        device.tried_at = monotonic_now();
        if (output.reopen() && output.set_line(false)) {
            board_.fell(line);
            replace_watchdog(); // the old one holds the lost device
            device.lost = false;
            pulses.set_lost(line, false);
            tell.device(line, DeviceState::back);
        }
    }
}

void LineKeeper::look_at_watchdog(PulseLines& pulses, const Tell& tell) {
    if (watched_ && !(watchdog_ && watchdog_->watches())) {
        watched_ = false;
        watchdog_tried_at_ = Nanos{};
        pulses.set_watched(false);
        tell.watchdog(false);
    }
    if (!watched_ && monotonic_now() - watchdog_tried_at_ >= try_every) {
        watchdog_tried_at_ = monotonic_now();
        watched_ = replace_watchdog();
        if (watched_) {
            pulses.set_watched(true);
            tell.watchdog(true);
        }
    }
}

bool LineKeeper::replace_watchdog() noexcept {
    try {
        watchdog_.reset();
        watchdog_ = std::make_unique<Watchdog>(lines_, board_, settings_);
        return true;
    } catch (const std::exception&) {
        return false; // no room for a process; tried again
    }
}

} // namespace millpond
