// Mains hum as sinusoids that every lane learns and subtracts (Widrow et al. 1975, from memory): no delay, since what
// is not hum passes untouched, and no ringing to speak of, since nothing is learned while an envelope is high. The
// kernel learns; here are the oscillators that all lanes share, and the true frequency of the mains. Thread: loop,
// after make. Private to this room.
#pragma once

#include "base/units.hpp"
#include "detector/kernel.hpp"
#include "detector/lanes.hpp"
#include "detector/mains_removal_settings.hpp"

#include <cstdint>
#include <string>

namespace millpond {

class MainsRemoval {
  public:
    /// Gives `lanes`, whose count of lanes is known, what the kernel needs; nothing where the method is off.
    /// Refuses a frequency that the rate cannot carry.
    void prepare(const MainsRemovalSettings& settings, Hertz rate, KernelState& lanes, const std::string& where);

    [[nodiscard]] bool on() const noexcept { return harmonics_ > 0; }
    [[nodiscard]] double frequency_hz() const noexcept { return frequency_hz_; }

    [[nodiscard]] std::uint64_t frames_to_step(std::uint64_t position) const noexcept {
        return step_frames_ - position % step_frames_;
    }
    /// Before the kernel runs from `position`: oscillators that were left behind by a gap catch up.
    void begin(std::uint64_t position) noexcept;
    /// After it ran up to `position`; never across a step's place.
    void end(std::uint64_t position) noexcept;
    void reset(KernelState& lanes) noexcept;

  private:
    void set_oscillators(std::uint64_t position) noexcept;
    [[nodiscard]] double turned() const noexcept;
    void remember() noexcept;

    Hertz rate_{};
    double nominal_hz_ = 0.0, frequency_hz_ = 0.0;
    std::size_t harmonics_ = 0, lane_count_ = 0;
    std::uint64_t step_frames_ = 1;
    Lanes<double> in_phase_, quadrature_, calm_; // as the kernel knows them
    Lanes<double> cosine_, sine_, turn_cosine_, turn_sine_;
    Lanes<double> in_phase_before_, quadrature_before_; // as they were a step ago
    double turns_ = 0.0;                                // of the first multiple at `anchor_`
    std::uint64_t anchor_ = 0, reached_ = 0;
    bool broken_ = true; // frames are missing since `anchor_`
};

} // namespace millpond
