// What makes the arbiter itself give up: a runaway, a stream with too many gaps, a floor out of its range.
// Thread: loop for everything but make and expect. Allocates after those: never.
#pragma once

#include "arbiter/runaway_guard.hpp"
#include "arbiter/stream_watch.hpp"

#include <optional>

namespace millpond {

class FaultWatch {
  public:
    static FaultWatch make(const LimitsSettings& settings, Hertz rate) {
        FaultWatch watch;
        watch.runaway_ = RunawayGuard::make(settings.runaway, rate);
        watch.gaps_ = GapWatch::make(settings, rate);
        watch.floors_ = FloorWatch::make(settings.floor);
        return watch;
    }
    /// So many floors will be told of. Thread: control.
    void expect_floors(std::size_t floors) { floors_.expect(floors); }

    void judged(SampleIndex at, Rule rule) noexcept { note(runaway_.judged(at, rule), StateCause::runaway); }
    void gap(SampleIndex from, std::uint64_t frames) noexcept {
        note(gaps_.gap(from, frames), StateCause::too_many_gaps);
    }
    void floor(std::size_t i, const FloorDetail& floor) noexcept {
        note(floors_.floor(i, floor), StateCause::floor_out_of_range);
    }

    /// Whoever arms says that what was is mended.
    void armed() noexcept {
        runaway_.reset();
        gaps_.reset();
        found_.reset();
    }

    /// The first fault since the last call.
    [[nodiscard]] std::optional<StateCause> take() noexcept {
        const auto found = found_;
        found_.reset();
        return found;
    }

  private:
    void note(bool bad, StateCause cause) noexcept {
        if (bad && !found_) {
            found_ = cause;
        }
    }

    RunawayGuard runaway_;
    GapWatch gaps_;
    FloorWatch floors_;
    std::optional<StateCause> found_;
};

} // namespace millpond
