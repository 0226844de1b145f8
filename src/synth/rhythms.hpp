// Theta and mains hum.
#pragma once

#include "base/random.hpp"
#include "synth/scene_element.hpp"

namespace millpond {

/// A sine whose frequency wanders about its mean with a memory of one second.
class Theta : public SceneElement {
  public:
    Theta(const SceneSettings& settings, std::vector<ChannelGains> gains);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    ThetaSettings theta_;
    double rate_hz_;
    std::vector<ChannelGains> gains_;
    Random random_;
    double keep_;
    double wander_ = 0.0;
    double turns_ = 0.0;
};

/// The same on all channels: a sine with its third and fifth harmonic.
class Mains : public SceneElement {
  public:
    explicit Mains(const SceneSettings& settings);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    MainsSettings mains_;
    double turns_each_frame_;
    double turns_;
};

} // namespace millpond
