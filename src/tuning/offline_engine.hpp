// The engine over a recording, for dry runs and sweeps: the same engine as in a session, its orders kept, not sent.
// Thread: one, cold. Memory: 64 bytes an event.
#pragma once

#include "engine/engine.hpp"
#include "referee/eligible_time.hpp"

#include <memory>
#include <vector>

namespace millpond {

class OfflineEngine {
  public:
    /// The speed gate is left out: nobody tells a speed here.
    /// `schedule`: places of a control schedule; `floors`: those of an earlier session, empty for a start from nothing.
    static OfflineEngine make(const EngineSettings& settings, const Channels& channels, Hertz rate,
                              std::vector<SampleIndex> schedule = {}, const std::vector<FloorState>& floors = {});

    void start(bool armed) { engine_->start(SampleIndex{0}, armed); }
    void process(const FrameBlock& block) { engine_->process(block); }
    void finish() { engine_->finish(); }

    [[nodiscard]] const std::vector<Event>& events() const noexcept { return kept_->events; }
    /// Triggers as they were ordered of the output.
    [[nodiscard]] const std::vector<Event>& orders() const noexcept { return kept_->orders; }
    [[nodiscard]] SampleIndex next_sample() const noexcept { return engine_->next_sample(); }
    [[nodiscard]] const Detector& detector() const noexcept { return engine_->detector(); }

    /// Time in which the detector could cross, so far: the detector's reading of eligible_time.hpp.
    [[nodiscard]] Intervals eligible() const;

  private:
    struct Kept : EventSink, PulsePort {
        std::vector<Event> events, orders;
        void take(const Event& event) noexcept override { events.push_back(event); }
        void fire(const Event& trigger) noexcept override { orders.push_back(trigger); }
    };

    OfflineEngine() = default;

    double blanking_ms_ = 0.0;
    Hertz rate_;
    std::unique_ptr<Kept> kept_; // the engine keeps references to it
    std::unique_ptr<Engine> engine_;
};

} // namespace millpond
