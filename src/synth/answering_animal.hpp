// An animal that answers pulses: a scene in which each pulse leaves its artefact on all channels and cuts an ongoing
// ripple short. For closed-loop trials inside one process. Thread: one owner.
//
//     auto animal = AnsweringAnimal::make(scene_settings, {});
//     while (animal.next(block)) { engine.process(...); if (it ordered a pulse) animal.pulse(animal.next_sample()); }
#pragma once

#include "synth/scene.hpp"

namespace millpond {

struct AnswerSettings {
    double artefact_uv = 25000.0;   ///< 100 times the default background's rms
    double phase_ms = 0.2;          ///< of each of the two phases; at least one frame
    double recovery_share = 0.3;    ///< what is left of the artefact after both
    double recovery_ms = 5.0;       ///< time constant in which that goes
    double silenced_after_ms = 4.0; ///< ripple begins to fall this long after the pulse
    double fall_ms = 5.0;           ///< and is gone this long after that

    bool operator==(const AnswerSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, AnswerSettings& answer) {
    visit.number("artefact_uv", answer.artefact_uv, {0.0, 1e6}, "height of a pulse's artefact, on all channels");
    visit.number("phase_ms", answer.phase_ms, {0.0, 100.0}, "length of each of its two phases; at least one frame");
    visit.number("recovery_share", answer.recovery_share, {0.0, 1.0}, "what is left of it after the second phase");
    visit.number("recovery_ms", answer.recovery_ms, {0.1, 1000.0}, "time constant in which that goes");
    visit.number("silenced_after_ms", answer.silenced_after_ms, {0.0, 1000.0}, "from the pulse until the ripple falls");
    visit.number("fall_ms", answer.fall_ms, {0.1, 1000.0}, "time in which the ripple falls to nothing");
}

class AnsweringAnimal {
  public:
    /// Refuses what Scene::make refuses.
    static AnsweringAnimal make(const SceneSettings& scene, const AnswerSettings& answer,
                                const std::string& where = "scene");

    /// As Scene::next.
    std::size_t next(std::span<float> interleaved);

    /// A pulse in the frame `at`; one that is already made is too late, and the next one takes it.
    void pulse(SampleIndex at);

    [[nodiscard]] SampleIndex next_sample() const noexcept { return scene_.next_sample(); }
    [[nodiscard]] const Channels& channels() const noexcept { return scene_.channels(); }
    [[nodiscard]] Hertz rate() const noexcept { return scene_.rate(); }
    /// Ripples that are over, in order, as they came to be: cut short by pulses.
    [[nodiscard]] const std::vector<RippleTruth>& truth() const noexcept { return scene_.truth(); }

  private:
    AnsweringAnimal(Scene scene, const AnswerSettings& answer);
    [[nodiscard]] double artefact(SampleIndex now);

    Scene scene_;
    AnswerSettings answer_;
    std::uint64_t phase_frames_;
    double keep_;
    double recovering_uv_ = 0.0;      ///< sum of the tails of all pulses that are over
    std::vector<SampleIndex> pulses_; ///< to come or in one of their phases
};

} // namespace millpond
