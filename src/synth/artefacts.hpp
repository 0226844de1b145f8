// What is on all channels at once, the reference too, and therefore no ripple: steps and bursts from muscles.
#pragma once

#include "base/random.hpp"
#include "synth/scene_element.hpp"

namespace millpond {

/// Sudden steps, up or down, from which every channel returns as an amplifier's high-pass does.
class Steps : public SceneElement {
  public:
    explicit Steps(const SceneSettings& settings);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    double height_uv_;
    double mean_wait_s_;
    Hertz rate_;
    Random random_;
    double keep_;
    double next_s_;
    double level_uv_ = 0.0;
};

/// Bursts of fast noise under a Hann window: the difference of neighbouring values of white noise.
class Muscle : public SceneElement {
  public:
    explicit Muscle(const SceneSettings& settings);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    double rms_uv_;
    double length_s_;
    double mean_wait_s_;
    Hertz rate_;
    Random random_;
    double begin_s_;
    double last_ = 0.0;
};

} // namespace millpond
