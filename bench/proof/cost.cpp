#include "proof/cost.hpp"

#include "support/bench.hpp"
#include "tuning/learning.hpp"
#include "tuning/offline_engine.hpp"

namespace millpond::bench {
namespace {

constexpr int repeats = 9;

double ns_a_frame(const DetectorSettings& settings, const Channels& channels, Hertz rate,
                  const std::vector<float>& data) {
    auto engine = OfflineEngine::make({settings, {}}, channels, rate);
    engine.start(false);
    const auto began = monotonic_now();
    engine.process({SampleIndex{0}, channels.size(), data});
    return static_cast<double>((monotonic_now() - began).count()) / static_cast<double>(data.size() / channels.size());
}

} // namespace

Cost cost_of(const DetectorSettings& textbook, const DetectorSettings& ours, std::size_t sites, bool reference,
             Hertz rate, double seconds) {
    auto channels = ripple_channels(sites);
    if (reference) {
        channels.push_back({"reference", ChannelRole::reference});
    }
    auto fitted = ours;
    fitted.evidence.background.clear();
    for (auto& mix : fitted.evidence.mixes) {
        mix.weights.assign(channels.size(), 1.0 / static_cast<double>(channels.size()));
        mix.pattern.clear();
    }
    const auto data = noise(static_cast<std::size_t>(seconds * rate.value) * channels.size(), 20.0);
    std::vector<double> textbook_ns, ours_ns;
    for (int i = 0; i < repeats; ++i) {
        textbook_ns.push_back(ns_a_frame(textbook, channels, rate, data));
        ours_ns.push_back(ns_a_frame(fitted, channels, rate, data));
    }
    return {median(textbook_ns), median(ours_ns)};
}

} // namespace millpond::bench
