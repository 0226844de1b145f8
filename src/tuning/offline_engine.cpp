#include "tuning/offline_engine.hpp"

namespace millpond {

OfflineEngine OfflineEngine::make(const EngineSettings& settings, const Channels& channels, Hertz rate,
                                  std::vector<SampleIndex> schedule, const std::vector<FloorState>& floors) {
    OfflineEngine offline;
    offline.blanking_ms_ = settings.detector.blanking_ms;
    offline.rate_ = rate;
    offline.kept_ = std::make_unique<Kept>();
    auto detector = Detector::make(settings.detector, channels, rate);
    if (!floors.empty()) {
        detector.warm_start(floors);
    }
    auto arbiter = settings.arbiter;
    arbiter.speed_gate.on = false; // a recording has no speed: the gate would stay closed
    offline.engine_ = std::make_unique<Engine>(std::move(detector), arbiter, std::move(schedule), rate, *offline.kept_,
                                               *offline.kept_);
    return offline;
}

Intervals OfflineEngine::eligible() const {
    EligibleRules rules;
    rules.settle_frames = detector().filter_settle_frames();
    rules.blanking_ms = blanking_ms_;
    return eligible_time(events(), rules, rate_, SampleIndex{0}, next_sample());
}

} // namespace millpond
