// Spikes of single cells near a site: bursts locked to theta, and single large ones.
#pragma once

#include "base/random.hpp"
#include "synth/rhythms.hpp"

namespace millpond {

/// Spikes to come and under way, each negative, then positive: the slope of a Gaussian bell, as an amplifier shows it
/// that smooths by a bell of 0.45 frames. So slow rates see of a short spike what is left of it, without aliases.
class SpikeTrain {
  public:
    explicit SpikeTrain(Hertz rate) noexcept : rate_(rate) {}

    struct Spike {
        double at_s;         ///< middle
        double amplitude_uv; ///< of its negative peak, before the amplifier
        double width_ms;     ///< within which it all but passes; its two peaks lie 0.6 of it apart
        std::size_t channel; ///< or the site where it is largest, which is its owner's affair
    };

    /// From a spike's middle until nothing of it is left; it must be begun that long before.
    [[nodiscard]] double reach_s(double width_ms) const noexcept { return 5.0 * seen_deviation_s(width_ms); }
    void begin(const Spike& spike) { spikes_.push_back(spike); }

    /// Calls add(spike, microvolts) for each spike that is under way.
    template <class Add> void at(double t, Add add) {
        for (const auto& spike : spikes_) {
            if (t >= spike.at_s - reach_s(spike.width_ms)) {
                add(spike, value(spike, t - spike.at_s));
            }
        }
        std::erase_if(spikes_, [&](const Spike& spike) { return t > spike.at_s + reach_s(spike.width_ms); });
    }

  private:
    [[nodiscard]] static double own_deviation_s(double width_ms) noexcept { return 0.3 * width_ms / 1000.0; }
    [[nodiscard]] double seen_deviation_s(double width_ms) const noexcept;
    [[nodiscard]] double value(const Spike& spike, double since_s) const noexcept;

    Hertz rate_;
    std::vector<Spike> spikes_;
};

/// Complex spikes of a cell that fires at one phase of theta. None in rest, where the scene knows states.
class SpikeBursts : public SceneElement {
  public:
    SpikeBursts(const SceneSettings& settings, const std::vector<ChannelGains>& gains,
                std::shared_ptr<const States> states, const Theta* theta);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    void begin(double at_s);

    SpikeBurstSettings bursts_;
    double theta_hz_;
    Hertz rate_;
    std::vector<double> shares_; ///< by channel
    std::shared_ptr<const States> states_;
    const Theta* theta_; ///< added before, in the same scene
    double turns_before_ = 0.0;
    Random random_;
    SpikeTrain train_;
};

/// One channel alone, any.
class SingleSpikes : public SceneElement {
  public:
    SingleSpikes(const SceneSettings& settings, std::size_t channels);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    ArtefactSettings artefacts_;
    std::size_t channels_;
    Hertz rate_;
    Random random_;
    SpikeTrain train_;
    double next_s_;
};

} // namespace millpond
