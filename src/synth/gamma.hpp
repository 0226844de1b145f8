// Bursts of fast gamma, below the ripple band and next to it.
#pragma once

#include "base/random.hpp"
#include "synth/scene_element.hpp"

namespace millpond {

/// One sine under a Hann window each, never two at once.
class Gamma : public SceneElement {
  public:
    Gamma(const SceneSettings& settings, const std::vector<ChannelGains>& gains);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    struct Burst {
        double begin_s, length_s, amplitude_uv, hz, phase_turns;
    };
    void draw_next(double not_before_s);

    GammaSettings gamma_;
    Hertz rate_;
    std::vector<double> shares_; ///< by channel
    Random random_;
    Burst burst_{};
    bool logged_ = false;
};

} // namespace millpond
