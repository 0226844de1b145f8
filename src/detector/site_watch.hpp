// Which channels are alive: about 250 looks a second, a verdict once a second. Thread: loop, after make.
// Private to this room.
#pragma once

#include "base/channels.hpp"
#include "base/event.hpp"
#include "detector/evidence_settings.hpp"

#include <cstdint>
#include <vector>

namespace millpond {

class SiteWatch {
  public:
    static SiteWatch make(const SiteWatchSettings& settings, const std::vector<ChannelRole>& inputs, Hertz rate);

    /// Frames from `position` to the next verdict's place: blocks lie on multiples of their length, whatever the
    /// packets.
    [[nodiscard]] std::uint64_t frames_to_verdict(std::uint64_t position) const noexcept {
        return block_frames_ - position % block_frames_;
    }

    /// Takes frames that never cross a verdict's place; the first is that at `position`. True where a verdict fell and
    /// moved something.
    bool take(std::uint64_t position, const float* frames, std::size_t count, std::size_t channels,
              const std::uint32_t* channel_of) noexcept;

    /// Forgets the second that is under way: frames are missing from it.
    void gap() noexcept { looks_ = 0; }
    void reset() noexcept;

    /// By input.
    [[nodiscard]] const std::vector<bool>& alive() const noexcept { return alive_; }
    [[nodiscard]] SiteState state(std::size_t input) const noexcept { return inputs_[input].state; }

  private:
    struct Input {
        ChannelRole role{};
        float least = 0.0F, most = 0.0F, before = 0.0F;
        double moved = 0.0;   ///< sum over this second's looks of |difference to the look before|
        double typical = 0.0; ///< the same in a usual second
        SiteState state = SiteState::alive;
        std::uint32_t typical_seconds = 0, well_seconds = 0;
    };

    void look(const float* frame, const std::uint32_t* channel_of) noexcept;
    bool judge() noexcept;
    [[nodiscard]] SiteState state_now(const Input& input, double others_rose) noexcept;
    template <class Figure> double median_of(Figure figure) noexcept;
    [[nodiscard]] double median_moved() noexcept;
    [[nodiscard]] double median_rise() noexcept;
    [[nodiscard]] bool last_ripple_site(const Input& input) const noexcept;

    SiteWatchSettings settings_;
    std::uint64_t stride_ = 1, block_frames_ = 1;
    std::uint32_t looks_ = 0, looks_needed_ = 1, seconds_back_ = 1;
    std::vector<Input> inputs_;
    std::vector<bool> alive_;
    std::vector<double> sorted_;
};

} // namespace millpond
