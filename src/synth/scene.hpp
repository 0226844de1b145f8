// An invented recording, frame by frame: background, ripples, rhythms and artefacts from one seed.
// Thread: one owner. The same settings give the same bits on every machine and at any block size. Memory does not grow
// with the duration, but for the truth.
//
//     auto scene = Scene::make(SceneSettings{});
//     std::vector<float> frames(1000 * scene.channels().size());
//     while (const auto count = scene.next(frames)) { ... }
#pragma once

#include "base/channels.hpp"
#include "synth/ripples.hpp"
#include "synth/scene_element.hpp"

#include <memory>
#include <string>

namespace millpond {

class Scene {
  public:
    /// Refuses settings that contradict each other, `where` naming them.
    static Scene make(const SceneSettings& settings, const std::string& where = "scene");

    /// Fills `frames` (a multiple of the channel count; microvolts) and returns the frames made, fewer than asked for
    /// only at the end of the recording.
    std::size_t next(std::span<float> frames);

    [[nodiscard]] const Channels& channels() const noexcept { return channels_; }
    [[nodiscard]] Hertz rate() const noexcept { return rate_; }
    [[nodiscard]] std::uint64_t frames() const noexcept { return frames_; }
    [[nodiscard]] SampleIndex next_sample() const noexcept { return next_; }

    /// Ripples that are over, in order.
    [[nodiscard]] const std::vector<RippleTruth>& truth() const noexcept { return ripples_->truth(); }
    [[nodiscard]] RippleTrain& ripples() noexcept { return *ripples_; }
    /// What else there is, in order of onset: states, bursts, artefacts, faults. Onset and end may lie beyond the
    /// recording's end.
    [[nodiscard]] std::vector<Happening> happenings() const;

  private:
    /// The new element, or null where it is not wanted.
    template <class Element, class... Arguments> Element* add(bool wanted, Arguments&&... arguments);

    explicit Scene(const SceneSettings& settings);

    Channels channels_;
    Hertz rate_;
    std::uint64_t frames_;
    std::shared_ptr<const States> states_;
    SampleIndex next_{};
    std::vector<std::unique_ptr<SceneElement>> elements_; ///< in the order in which they are added up
    RippleTrain* ripples_ = nullptr;                      ///< one of them
    std::vector<double> frame_;
};

} // namespace millpond
