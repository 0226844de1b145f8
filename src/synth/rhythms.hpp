// Theta, delta and mains hum.
#pragma once

#include "base/random.hpp"
#include "synth/slow_wander.hpp"
#include "synth/states.hpp"

namespace millpond {

/// A sine whose frequency wanders about its mean with a memory of one second.
class Theta : public SceneElement {
  public:
    Theta(const SceneSettings& settings, std::vector<ChannelGains> gains, std::shared_ptr<const States> states);
    void add(SampleIndex at, std::span<double> frame) override;

    /// Part of its cycle in the frame last added: 0 where it rises through nothing, 0.75 in its trough.
    [[nodiscard]] double turns() const noexcept { return turns_; }

  private:
    ThetaSettings theta_;
    Hertz rate_;
    std::vector<ChannelGains> gains_;
    std::shared_ptr<const States> states_;
    Random random_;
    double keep_;
    double wander_ = 0.0;
    double turns_ = 0.0;
};

/// Slow waves: what two resonators of one frequency, one after the other, make of white noise. Two, so that nothing
/// of them reaches the ripple band.
class Delta : public SceneElement {
  public:
    Delta(const SceneSettings& settings, const std::vector<ChannelGains>& gains, std::shared_ptr<const States> states);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    struct Complex {
        double real = 0.0, imaginary = 0.0;
    };
    [[nodiscard]] Complex resonated(Complex state, Complex input) const noexcept;
    double next(double white) noexcept;

    Hertz rate_;
    std::vector<double> sizes_uv_; ///< by channel
    std::shared_ptr<const States> states_;
    Random random_;
    Complex turn_;
    Complex first_, second_;
    double gain_ = 1.0;
};

/// The same on all channels: a sine with its harmonics, whose size may wander.
class Mains : public SceneElement {
  public:
    explicit Mains(const SceneSettings& settings);
    void add(SampleIndex at, std::span<double> frame) override;

  private:
    MainsSettings mains_;
    Hertz rate_;
    double turns_;
    SlowWander wander_;
};

} // namespace millpond
