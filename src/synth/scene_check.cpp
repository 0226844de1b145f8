#include "synth/scene_check.hpp"

#include "base/refusal.hpp"

#include <algorithm>

namespace millpond {
namespace {

class SceneCheck {
  public:
    SceneCheck(const SceneSettings& scene, const std::string& where) : scene_(scene), where_(where) {}

    void ripples() const {
        const auto& ripples = scene_.ripples;
        // One ripple in 1 / (1 - share) begins a chain, and only chains wait for their time.
        const double followed = ripples.doublet_share;
        const double busy_s = (ripples.duration_ms + ripples.min_gap_ms) / 1000.0 * (1.0 - followed) +
                              followed * std::max(ripples.doublet_most_ms, ripples.duration_ms + 20.0) / 1000.0;
        need(ripples.rate_per_s * busy_s < 0.9, "ripples.rate_per_s", std::to_string(ripples.rate_per_s),
             "at most 0.9 / (duration + min_gap), less with doublets, here " + std::to_string(0.9 / busy_s));
        need(scene_.sharp_wave.duration_ms <= 2.0 * ripples.min_gap_ms, "sharp_wave.duration_ms",
             std::to_string(scene_.sharp_wave.duration_ms), "at most twice ripples.min_gap_ms");
        const double highest_hz = std::max(ripples.start_hz, ripples.end_hz) + 3.0 * ripples.frequency_sd_hz;
        need(highest_hz < 0.45 * scene_.rate_hz, "ripples.start_hz, end_hz, frequency_sd_hz",
             "ripples up to " + std::to_string(highest_hz) + " Hz", "below 0.45 of rate_hz");
        in_order("ripples.doublet_least_ms", ripples.doublet_least_ms, ripples.doublet_most_ms);
    }

    void rhythms() const {
        in_order("gamma.low_hz", scene_.gamma.low_hz, scene_.gamma.high_hz);
        need(scene_.gamma.high_hz < 0.45 * scene_.rate_hz || scene_.gamma.rate_per_s == 0.0, "gamma.high_hz",
             std::to_string(scene_.gamma.high_hz), "below 0.45 of rate_hz");
        need(5.0 * scene_.mains.frequency_hz < 0.5 * scene_.rate_hz || scene_.mains.amplitude_uv == 0.0,
             "mains.frequency_hz", "a fifth harmonic above half of rate_hz", "a lower frequency, or no mains");
    }

    void spikes() const {
        const auto& bursts = scene_.spike_bursts;
        in_order("spike_bursts.least_spikes", bursts.least_spikes, bursts.most_spikes);
        in_order("spike_bursts.least_interval_ms", bursts.least_interval_ms, bursts.most_interval_ms);
        in_order("artefacts.spike_least_ms", scene_.artefacts.spike_least_ms, scene_.artefacts.spike_most_ms);
        if (bursts.share_of_cycles > 0.0) {
            is_a_site("spike_bursts.site", bursts.site);
        }
    }

    void faults() const {
        is_a_site("faults.dead_site", scene_.faults.dead_site);
        is_a_site("faults.failing_site", scene_.faults.failing_site);
    }

  private:
    void need(bool good, const char* key, const std::string& found, const std::string& allowed) const {
        if (!good) {
            throw Refusal(where_ + ": " + key, found, allowed);
        }
    }
    void in_order(const char* key, double least, double most) const {
        need(least <= most, key, std::to_string(least), "at most the other end, here " + std::to_string(most));
    }
    void is_a_site(const char* key, int site) const {
        need(site <= scene_.sites, key, std::to_string(site), "a site, here 1 to " + std::to_string(scene_.sites));
    }

    const SceneSettings& scene_;
    const std::string& where_;
};

} // namespace

void check_scene(const SceneSettings& settings, const std::string& where) {
    const SceneCheck check(settings, where);
    check.ripples();
    check.rhythms();
    check.spikes();
    check.faults();
}

} // namespace millpond
