// What is no ripple and no brain: steps, on all channels or on one, and bursts from muscles.
#pragma once

#include "base/random.hpp"
#include "synth/scene_element.hpp"

namespace millpond {

enum class StepReach : unsigned char {
    all_channels,
    one_channel
};

/// Sudden steps, up or down, from which a channel returns as an amplifier's high-pass does.
class Steps : public SceneElement {
  public:
    Steps(const SceneSettings& settings, StepReach reach);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    double height_uv_;
    StepReach reach_;
    double mean_wait_s_;
    Hertz rate_;
    Random random_;
    double keep_;
    double next_s_;
    std::vector<double> levels_uv_; ///< one for all, or one a channel
};

/// White noise through a first-order high-pass and a second-order low-pass, scaled to variance 1.
class BandNoise {
  public:
    BandNoise(Random random, double low_hz, double high_hz, Hertz rate);
    double next() noexcept { return gain_ * filtered(random_.normal()); }

  private:
    double filtered(double white) noexcept;

    Random random_;
    double low_keep_, high_keep_;
    double last_ = 0.0, high_passed_ = 0.0, once_ = 0.0, twice_ = 0.0;
    double gain_ = 1.0;
};

/// Bursts of such noise under a Hann window, mostly common to all channels; in chewing one follows another.
class Muscle : public SceneElement {
  public:
    Muscle(const SceneSettings& settings, const std::vector<ChannelGains>& gains);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    void draw_next(double not_before_s);

    ArtefactSettings artefacts_;
    Hertz rate_;
    Random random_;
    double begin_s_ = 0.0;
    double size_uv_ = 0.0;
    BandNoise shared_;
    std::vector<BandNoise> own_;
    std::vector<double> shares_; ///< by channel
};

} // namespace millpond
