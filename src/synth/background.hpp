// Background whose power falls with frequency, partly common to all channels, and each amplifier's own white noise.
#pragma once

#include "base/random.hpp"
#include "synth/scene_element.hpp"

namespace millpond {

/// Turns white noise of variance 1 into noise of variance 1 whose power is flat up to a corner and then falls as
/// f^-slope: poles an octave apart with a zero slope/2 octaves above each (fractional-order filter by alternating poles
/// and zeros, as of Oustaloup; common practice), each mapped to z = exp(-2 pi f / rate).
class SlopeFilter {
  public:
    SlopeFilter(double slope, double corner_hz, Hertz rate);
    double next(double white) noexcept;

  private:
    struct Section {
        double zero, pole;
    };
    double filtered(double white) noexcept;

    std::vector<Section> sections_;
    std::vector<double> held_; ///< last input of each section, then the last output of all
    double gain_ = 1.0;
};

/// The shared part is the same on all channels, or its correlation falls as exp(-distance / correlation_um): then each
/// channel takes it from its neighbour and adds something of its own.
class Background : public SceneElement {
  public:
    Background(const SceneSettings& settings, const std::vector<ChannelGains>& gains);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    struct Noise {
        Random random;
        SlopeFilter filter;
        double next() noexcept { return filter.next(random.normal()); }
    };

    /// The shared part's next value on each channel, of variance 1, into `shared_now_`.
    void share();

    double shared_uv_;
    double own_uv_;
    double amplifier_uv_;
    Noise shared_;
    std::vector<Noise> near_; ///< by channel, where the shared part is not the same on all of them
    std::vector<std::size_t> neighbour_;
    std::vector<double> correlation_; ///< of it with the neighbour's
    std::vector<double> shared_now_;
    std::vector<Noise> own_;
    std::vector<Random> amplifier_;
};

} // namespace millpond
