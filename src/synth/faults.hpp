// What befalls a channel as a whole: slow drift of its gain, and sites that are dead or fail.
#pragma once

#include "synth/scene_element.hpp"
#include "synth/slow_wander.hpp"

namespace millpond {

class GainDrift : public SceneElement {
  public:
    GainDrift(const SceneSettings& settings, std::size_t channels);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    double log_sd_;
    Hertz rate_;
    std::vector<SlowWander> wander_;
};

/// Replaces whatever the site would show.
class Faults : public SceneElement {
  public:
    explicit Faults(const SceneSettings& settings);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    [[nodiscard]] double shown(FaultKind kind) noexcept;

    FaultSettings faults_;
    Hertz rate_;
    Random random_;
};

} // namespace millpond
