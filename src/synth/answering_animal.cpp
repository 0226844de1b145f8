#include "synth/answering_animal.hpp"

namespace millpond {

AnsweringAnimal AnsweringAnimal::make(const SceneSettings& scene, const AnswerSettings& answer,
                                      const std::string& where) {
    return {Scene::make(scene, where), answer};
}

AnsweringAnimal::AnsweringAnimal(Scene scene, const AnswerSettings& answer)
    : scene_(std::move(scene)), answer_(answer),
      phase_frames_(std::max<std::uint64_t>(1, frames_in_ms(answer.phase_ms, scene_.rate()))),
      keep_(portable_exp(-1000.0 / (answer.recovery_ms * scene_.rate().value))) {}

void AnsweringAnimal::pulse(SampleIndex at) {
    pulses_.push_back(std::max(at, next_sample()));
}

std::size_t AnsweringAnimal::next(std::span<float> interleaved) {
    const std::size_t channels = scene_.channels().size();
    std::size_t made = 0;
    for (; (made + 1) * channels <= interleaved.size(); ++made) {
        const auto frame = interleaved.subspan(made * channels, channels);
        const auto now = scene_.next_sample();
        if (std::find(pulses_.begin(), pulses_.end(), now) != pulses_.end()) {
            scene_.ripples().cut(now, answer_.silenced_after_ms, answer_.fall_ms);
        }
        if (scene_.next(frame) == 0) {
            break;
        }
        const auto added = static_cast<float>(artefact(now));
        for (auto& value : frame) {
            value += added;
        }
    }
    return made;
}

double AnsweringAnimal::artefact(SampleIndex now) {
    recovering_uv_ *= keep_;
    double sum = 0.0;
    std::erase_if(pulses_, [&](SampleIndex at) {
        if (now < at) {
            return false;
        }
        const std::uint64_t since = now - at;
        if (since < 2 * phase_frames_) {
            sum += since < phase_frames_ ? answer_.artefact_uv : -answer_.artefact_uv;
            return false;
        }
        recovering_uv_ -= answer_.recovery_share * answer_.artefact_uv;
        return true;
    });
    return sum + recovering_uv_;
}

} // namespace millpond
