#include "synth/scene.hpp"

#include "synth/artefacts.hpp"
#include "synth/background.hpp"
#include "synth/faults.hpp"
#include "synth/gamma.hpp"
#include "synth/rhythms.hpp"
#include "synth/scene_check.hpp"
#include "synth/spikes.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

Channels channels_of(const SceneSettings& settings) {
    Channels channels;
    for (int i = 1; i <= settings.sites; ++i) {
        channels.push_back({"site" + std::to_string(i), ChannelRole::ripple});
    }
    if (settings.reference) {
        channels.push_back({"reference", ChannelRole::reference});
    }
    return channels;
}

} // namespace

std::vector<ChannelGains> channel_gains(const SceneSettings& settings) {
    std::vector<ChannelGains> gains;
    for (int i = 0; i < settings.sites; ++i) {
        const double below_um = (i - 0.5 * (settings.sites - 1)) * settings.site_spacing_um;
        const double spread = below_um / settings.ripples.spread_um;
        const double depth = below_um / settings.sharp_wave.depth_um;
        // The sharp wave turns its sign in the layer, and is largest one depth below (negative) and above (positive).
        gains.push_back(
            {portable_exp(-0.5 * spread * spread), -depth * portable_exp(0.5 - 0.5 * depth * depth), 1.0, below_um});
    }
    if (settings.reference) {
        const double uppermost_um = -0.5 * (settings.sites - 1) * settings.site_spacing_um;
        gains.push_back({0.0, 0.0, 0.5, uppermost_um - settings.reference_um, true});
    }
    return gains;
}

Scene Scene::make(const SceneSettings& settings, const std::string& where) {
    check_scene(settings, where);
    return Scene(settings);
}

Scene::Scene(const SceneSettings& settings)
    : channels_(channels_of(settings)), rate_{settings.rate_hz},
      frames_(static_cast<std::uint64_t>(std::llround(settings.duration_s * settings.rate_hz))),
      frame_(channels_.size()) {
    const auto gains = channel_gains(settings);
    states_ = std::make_shared<const States>(settings);
    add<Background>(true, settings, gains);
    ripples_ = add<RippleTrain>(true, settings, gains, states_);
    const bool bursts = settings.spike_bursts.share_of_cycles > 0.0;
    const auto* theta = add<Theta>(settings.theta.amplitude_uv > 0.0 || bursts, settings, gains, states_);
    add<Mains>(settings.mains.amplitude_uv > 0.0, settings);
    add<Steps>(settings.artefacts.steps_per_min > 0.0, settings, StepReach::all_channels);
    add<Muscle>(settings.artefacts.muscle_per_min > 0.0, settings, gains);
    add<Delta>(settings.delta.rms_uv > 0.0, settings, gains, states_);
    add<Gamma>(settings.gamma.rate_per_s > 0.0, settings, gains);
    add<SpikeBursts>(bursts, settings, gains, states_, theta);
    add<Steps>(settings.artefacts.site_steps_per_min > 0.0, settings, StepReach::one_channel);
    add<SingleSpikes>(settings.artefacts.spikes_per_min > 0.0, settings, channels_.size());
    // What changes the channel as a whole comes last.
    add<GainDrift>(settings.gain_drift.log_sd > 0.0, settings, channels_.size());
    add<Faults>(settings.faults.dead_site > 0 || settings.faults.failing_site > 0, settings);
}

template <class Element, class... Arguments> Element* Scene::add(bool wanted, Arguments&&... arguments) {
    if (!wanted) {
        return nullptr;
    }
    auto element = std::make_unique<Element>(std::forward<Arguments>(arguments)...);
    auto* place = element.get();
    elements_.push_back(std::move(element));
    return place;
}

std::vector<Happening> Scene::happenings() const {
    auto all = states_->happenings();
    for (const auto& element : elements_) {
        all.insert(all.end(), element->happenings().begin(), element->happenings().end());
    }
    std::stable_sort(all.begin(), all.end(), [](const auto& a, const auto& b) { return a.onset_s < b.onset_s; });
    return all;
}

std::size_t Scene::next(std::span<float> frames) {
    const auto wanted = std::min<std::uint64_t>(frames.size() / frame_.size(), frames_ - next_.value);
    for (std::size_t i = 0; i < wanted; ++i) {
        std::fill(frame_.begin(), frame_.end(), 0.0);
        for (const auto& element : elements_) {
            element->add(next_, frame_);
        }
        std::transform(frame_.begin(), frame_.end(), frames.begin() + static_cast<std::ptrdiff_t>(i * frame_.size()),
                       [](double value) { return static_cast<float>(value); });
        next_ = next_ + 1;
    }
    return wanted;
}

} // namespace millpond
