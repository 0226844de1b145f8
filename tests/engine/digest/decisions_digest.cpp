// Prints one line for each of many settings: a digest of every event that the engine emits over the same invented
// signal. Compiled more than once, at different optimisation levels, by tests/CMakeLists.txt; a test compares what they
// print.
#include "engine/engine.hpp"
#include "support/signals.hpp"

#include <cinttypes>
#include <cstdio>
#include <cstring>

namespace {

using namespace millpond;

struct Digest : EventSink, PulsePort {
    std::uint64_t value = 0xCBF29CE484222325ULL; // FNV-1a, 64 bits
    std::uint64_t detections = 0;
    void take(const Event& event) noexcept override {
        unsigned char bytes[sizeof event];
        std::memcpy(bytes, &event, sizeof event);
        for (const unsigned char byte : bytes) {
            value = (value ^ byte) * 0x100000001B3ULL;
        }
        detections += event.kind == EventKind::detection ? 1 : 0;
    }
    void fire(const Event& trigger) noexcept override { take(trigger); }
};

void run(const DetectorSettings& detector, Hertz rate, KernelWidth width, const char* name) {
    const std::size_t channels = 5, seconds = 8;
    const auto per_second = static_cast<std::size_t>(rate.value);
    auto data = test::white_noise(seconds * per_second, channels, 20.0, 7);
    for (std::size_t second = 3; second < seconds; ++second) {
        test::add_burst(data, channels, second * per_second, per_second / 12, rate.value, 200.0, 400.0);
    }
    for (std::size_t i = 4 * per_second; i < 6 * per_second; ++i) {
        data[i * channels + 1] = detector.method == DetectionMethod::evidence ? 5.0F : data[i * channels + 1];
    }
    Digest digest;
    Engine engine(Detector::make(detector, ripple_channels(channels), rate, width), ArbiterSettings{}, {}, rate, digest,
                  digest);
    engine.start(SampleIndex{0}, true);
    engine.process(test::block_of(data, channels));
    std::printf("%s at %g Hz: %016" PRIx64 ", %" PRIu64 " detections\n", name, rate.value, digest.value,
                digest.detections);
}

} // namespace

namespace {

// Site 2 dies and comes back, so that weights are solved anew; gate and mains removal are on as well.
void run_evidence(Hertz rate, bool learned) {
    DetectorSettings detector;
    detector.method = DetectionMethod::evidence;
    detector.floor.settle_s = 1.0;
    detector.evidence.site_watch.back_after_s = 1.0;
    detector.state_gate.on = true;
    detector.mains.method = MainsMethod::adaptive;
    if (learned) {
        detector.evidence.mixes = {{"learned", {0.2, 0.3, 0.2, 0.2, 0.1}, {1.0, 3.0, 2.0, 1.0, 0.5}}};
        detector.evidence.background = {2.0, 0.5, 3.0, 0.2, 0.6, 2.0, 0.1, 0.2, 0.5, 2.5, 0.1, 0.1, 0.2, 0.4, 1.5};
        detector.evidence.features[0].mix = "learned";
    }
    run(detector, rate, KernelWidth::automatic, learned ? "evidence learned" : "evidence default");
}

} // namespace

int main() {
    for (const double rate : {1250.0, 20000.0, 30000.0}) {
        run_evidence(Hertz{rate}, false);
        run_evidence(Hertz{rate}, true);
        for (const auto& family : filter_families) {
            for (const auto& method : envelope_methods) {
                for (const int order : {2, 3, 5}) {
                    DetectorSettings detector;
                    detector.method = DetectionMethod::envelope;
                    detector.filter.family = family.value;
                    detector.filter.order = order;
                    detector.filter.transition_hz = 100.0;
                    detector.envelope.method = method.value;
                    detector.floor.settle_s = 1.0;
                    char name[64];
                    std::snprintf(name, sizeof name, "%s order %d %s", family.word.data(), order, method.word.data());
                    if (family.value != FilterFamily::fir_minimum_phase || (order == 2 && rate < 2000.0)) {
                        run(detector, Hertz{rate}, KernelWidth::automatic, name);
                    }
                }
            }
        }
    }
}
