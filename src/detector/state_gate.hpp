// Rest or running, by the power of theta against that of delta: block means of about 4 ms, a verdict ten times a
// second. Thread: loop, after make. Private to this room.
#pragma once

#include "base/channels.hpp"
#include "detector/section_cascade.hpp"
#include "detector/state_gate_settings.hpp"

#include <cstdint>
#include <string>
#include <vector>

namespace millpond {

class StateGate {
  public:
    /// Refuses bands out of order, levels out of order, and a signal that the channels do not have.
    static StateGate make(const StateGateSettings& settings, const Channels& channels, Hertz rate,
                          const std::string& where);

    [[nodiscard]] bool on() const noexcept { return settings_.on; }
    [[nodiscard]] bool open() const noexcept { return open_; }

    /// Frames from `position` to the next verdict's place: on multiples of their distance, whatever the packets.
    [[nodiscard]] std::uint64_t frames_to_verdict(std::uint64_t position) const noexcept {
        return verdict_frames_ - position % verdict_frames_;
    }

    /// Takes frames that never cross a verdict's place; the first is that at `position`. True where a verdict moved the
    /// gate.
    bool take(std::uint64_t position, const float* frames, std::size_t count, std::size_t channels) noexcept;

    /// Frames are missing here: the block that is under way is forgotten. What is missing is bridged by a straight line
    /// where it is short, as after a pulse; else the signal goes on without a step.
    void splice() noexcept { looks_ = 0; }
    /// Leaves out channels that are not alive; `alive` by looked-at channel. Where none is left, takes all.
    void use_alive(const std::vector<bool>& alive) noexcept;
    void reset() noexcept;

  private:
    struct Band {
        SectionCascade filter;
        double power = 0.0;
    };
    struct Source {
        std::uint32_t channel;
        std::size_t input;
        double sum = 0.0;
        bool used = true;
    };

    static Band band_of(double low_hz, double high_hz, Hertz rate, const std::string& where);
    void end_block(std::uint64_t number) noexcept;
    void bridge(std::uint64_t missing, double value) noexcept;
    void step(double value) noexcept;
    bool judge() noexcept;

    StateGateSettings settings_;
    std::vector<Source> sources_;
    Band theta_, delta_;
    std::uint64_t stride_ = 1, block_looks_ = 1, verdict_frames_ = 1;
    double smoothing_ = 1.0;
    std::uint64_t looks_ = 0, blocks_ = 0, blocks_needed_ = 0;
    std::uint64_t next_block_ = 0;
    double level_ = 0.0, last_ = 0.0;
    bool resume_ = true, open_ = true;
};

} // namespace millpond
