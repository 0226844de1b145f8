// The role of everything that a scene is made of: each element adds its share to every frame.
// Thread: one, whoever owns the scene. Works frame by frame, so that block sizes cannot matter.
#pragma once

#include "base/units.hpp"
#include "synth/scene_settings.hpp"

#include <cstdint>
#include <span>
#include <vector>

namespace millpond {

/// Stream numbers of the elements: never change or reuse one, or old seeds give other recordings.
enum class RandomStream : std::uint64_t {
    ripples = 1,
    theta = 2,
    mains = 3,
    steps = 4,
    muscle = 5,
    background_shared = 6,
    states = 7,
    more_of_ripples = 8, ///< doublets, small ones, depths: what came after `ripples` was settled
    delta = 9,
    gamma = 10,
    spike_bursts = 11,
    mains_drift = 12,
    site_steps = 13,
    single_spikes = 14,
    faults = 15,
    background_own = 1000, ///< and one more for each channel
    amplifier = 2000,      ///< likewise, as all below
    background_near = 3000,
    gain_drift = 4000,
    muscle_own = 5000,
};

constexpr std::uint64_t number_of(RandomStream stream, std::size_t channel = 0) noexcept {
    return static_cast<std::uint64_t>(stream) + channel;
}

/// What stands in the truth beside ripples.
enum class HappeningKind : std::uint8_t {
    rest,   ///< a state of the animal
    run,    ///< the other
    gamma,  ///< a burst of fast gamma
    spikes, ///< a burst of one cell's spikes
    spike,  ///< a single large one
    step,   ///< on all channels or on one; its duration is 0
    muscle, ///< a burst from muscles
    dead,   ///< a site shows nothing of use
};

/// Their words in the column trial_type.
inline constexpr Choice<HappeningKind> happening_kinds[] = {
    {HappeningKind::rest, "rest"},     {HappeningKind::run, "run"},     {HappeningKind::gamma, "gamma"},
    {HappeningKind::spikes, "spikes"}, {HappeningKind::spike, "spike"}, {HappeningKind::step, "step"},
    {HappeningKind::muscle, "muscle"}, {HappeningKind::dead, "dead"}};

struct Happening {
    double onset_s;
    double end_s;
    HappeningKind kind;
};

class SceneElement {
  public:
    virtual ~SceneElement() = default;

    /// Adds to the frame at `at`, one value a channel, microvolts. Called once for each place in turn.
    virtual void add(SampleIndex at, std::span<double> frame) = 0;

    /// What has begun so far, in order. Grows with the recording: 24 bytes each.
    [[nodiscard]] const std::vector<Happening>& happenings() const noexcept { return happenings_; }

  protected:
    std::vector<Happening> happenings_;
};

/// Where a channel lies and how large things are there. The reference lies far away: ripples and sharp waves are 0.
struct ChannelGains {
    double ripple;
    double sharp_wave;
    double theta;
    double below_um = 0.0; ///< below the layer's middle
    bool reference = false;
};

/// Sites first, evenly about the pyramidal layer, from above to below; the reference, if any, last.
[[nodiscard]] std::vector<ChannelGains> channel_gains(const SceneSettings& settings);

} // namespace millpond
