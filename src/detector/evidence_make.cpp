// Making a detector of method evidence: features, their filters and weights, the watch over sites. Thread: control.
#include "base/refusal.hpp"
#include "detector/detector_state.hpp"
#include "detector/evidence_calibration.hpp"

#include <algorithm>
#include <cmath>
#include <cstdio>

namespace millpond {
namespace {

// A ripple of 160 uV stands some 8 times as far from where it was 0.4 ms ago as the background of the quiet scene does,
// a step of 1250 uV more than 100 times.
constexpr double jump_times = 20.0;
constexpr double jump_follow_ms = 0.4;
constexpr double jump_fade_ms = 8.0;
constexpr double jump_usual_ms = 2000.0;

constexpr Section straight_through{1.0, 0.0, 0.0, 0.0, 0.0};

std::string shown(double hertz) {
    char text[32];
    std::snprintf(text, sizeof text, "%g", hertz);
    return text;
}

BandpassDesign design_feature(const FeatureSettings& feature, Hertz rate, const std::string& where) {
    FilterSettings filter;
    filter.low_hz = feature.low_hz;
    filter.high_hz = feature.high_hz;
    filter.order = feature.order;
    return design_bandpass(filter, rate, where);
}

Hertz centre_of(const FeatureSettings& feature) noexcept {
    return {std::sqrt(feature.low_hz * feature.high_hz)};
}

} // namespace

void Detector::State::choose_features(const std::string& where) {
    mixes = SiteMixes::make(settings.evidence, inputs, where);
    for (std::size_t i = 0; i < settings.evidence.features.size(); ++i) {
        auto feature = settings.evidence.features[i];
        const std::size_t mix_place = mixes.place_of(feature.mix);
        if (mix_place == mixes.count()) {
            throw Refusal(where + ".features[" + std::to_string(i) + "].mix", feature.mix,
                          "sites, reference, or a name from mixes");
        }
        if (!mixes.takes_something(mix_place)) {
            continue; // looks at references, and this stream has none
        }
        const double highest_hz = 0.45 * rate.value;
        if (feature.low_hz >= highest_hz) {
            if (feature.weight > 0.0) {
                throw Refusal(where + ".features[" + std::to_string(i) + "].low_hz", shown(feature.low_hz),
                              "below 0.45 of the rate, " + shown(highest_hz) + " Hz");
            }
            continue; // speaks against ripples in a band that this stream does not have
        }
        feature.high_hz = std::min(feature.high_hz, highest_hz);
        features.push_back(feature);
        mix_of.push_back(mix_place);
    }
    if (std::none_of(features.begin(), features.end(), [](const auto& feature) { return feature.weight > 0.0; })) {
        throw Refusal(where + ".features", "no feature that speaks for a ripple", "at least one of weight above 0");
    }
    lanes.signal_lanes = features.size();
    lanes.lanes = (features.size() + 1 + lane_group - 1) / lane_group * lane_group;
    mix = Lanes<double>(lanes.inputs * lanes.lanes);
    lanes.mix = mix.data();
    mix_weights.resize(lanes.inputs);
    site_watch = SiteWatch::make(settings.evidence.site_watch, inputs, rate);
    journaled.assign(lanes.inputs, SiteState::alive);
}

void Detector::State::allocate_own_filters(const std::string& where) {
    std::vector<BandpassDesign> designs;
    double most_weight = 0.0;
    for (std::size_t i = 0; i < features.size(); ++i) {
        const auto& feature = features[i];
        designs.push_back(design_feature(feature, rate, where + ".features[" + std::to_string(i) + "]"));
        lanes.sections = std::max(lanes.sections, designs.back().sections.size());
        filter_settle =
            std::max(filter_settle, designs.back().settle_samples() + frames_in_ms(5.0 * feature.smoothing_ms, rate));
        if (feature.weight > most_weight) {
            heaviest = i;
            most_weight = feature.weight;
            design = designs.back();
            filter_delay = design.group_delay_samples(centre_of(feature), rate);
            delay = filter_delay + feature.smoothing_ms * rate.value / 1000.0;
        }
    }
    coefficients = Lanes<double>(lanes.sections * 5 * lanes.lanes);
    quadratures = Lanes<double>(lanes.lanes);
    smoothings = Lanes<double>(lanes.lanes);
    smoothings.fill(1.0);
    for (std::size_t lane = 0; lane < features.size(); ++lane) {
        const auto& sections = designs[lane].sections;
        for (std::size_t i = 0; i < lanes.sections; ++i) {
            const auto& section = i < sections.size() ? sections[i] : straight_through;
            const double row[5] = {section.b0, section.b1, section.b2, section.a1, section.a2};
            for (std::size_t k = 0; k < 5; ++k) {
                coefficients[(5 * i + k) * lanes.lanes + lane] = row[k];
            }
        }
        quadratures[lane] = quadrature_at(centre_of(features[lane]), rate);
        smoothings[lane] = 1.0 / (1.0 + features[lane].smoothing_ms * rate.value / 1000.0 / 2.0);
    }
    section_states = Lanes<double>(lanes.lanes * lanes.sections * 2);
    lanes.coefficients = coefficients.data();
    lanes.section_states = section_states.data();
    lanes.quadratures = quadratures.data();
    lanes.smoothings = smoothings.data();
}

void Detector::State::allocate_jumps() {
    for (auto* values : {&followed, &largest_jump, &usual_jump}) {
        *values = Lanes<double>(lanes.lanes);
    }
    auto& jump = lanes.jump;
    jump.followed = followed.data();
    jump.largest = largest_jump.data();
    jump.usual = usual_jump.data();
    jump.follow = 1.0 / (1.0 + jump_follow_ms * rate.value / 1000.0);
    jump.fade = 1.0 - 1.0 / (1.0 + jump_fade_ms * rate.value / 1000.0);
    jump.full_frames = frames_in_ms(jump_usual_ms, rate);
    jump.weight = 1.0 / (static_cast<double>(jump.full_frames) + 1.0);
}

// A step lifts what is smoothed little before what speaks against it has risen; its own height gives it away.
bool Detector::State::jumped() const noexcept {
    return evidence() && largest_jump[heaviest] > jump_times * usual_jump[heaviest];
}

void Detector::State::allocate_evidence_floor(const std::string& where) {
    for (std::size_t lane = 0; lane < features.size(); ++lane) {
        sum_weight[lane] = features[lane].weight;
    }
    settings.threshold.deviations = threshold_for(settings.evidence, where);
    settings.threshold.rearm_deviations = std::min(settings.threshold.rearm_deviations, settings.threshold.deviations);
    vote_of(lanes.signal_lanes);
    votes_needed = 1;
}

// The mixes over what is alive. A change makes no step: the level takes it up.
void Detector::State::mix_anew() noexcept {
    for (std::size_t lane = 0; lane < features.size(); ++lane) {
        mixes.weights(mix_of[lane], site_watch.alive(), mix_weights.data());
        for (std::size_t i = 0; i < lanes.inputs; ++i) {
            mix[i * lanes.lanes + lane] = mix_weights[i];
        }
    }
    resume = true;
}

void Detector::State::watch_sites(const FrameBlock& block) noexcept {
    if (site_watch.take(position, block.data.data(), block.frames(), lanes.channels, channel_of.data())) {
        mix_anew();
        state_gate.use_alive(site_watch.alive());
        sites_changed = true;
    }
}

std::optional<SiteChange> Detector::site_change() noexcept {
    auto& s = *state_;
    for (std::size_t i = 0; s.sites_changed && i < s.inputs.size(); ++i) {
        if (s.journaled[i] != s.site_watch.state(i)) {
            s.journaled[i] = s.site_watch.state(i);
            return SiteChange{static_cast<std::uint16_t>(s.channel_of[i]), s.journaled[i]};
        }
    }
    s.sites_changed = false;
    return std::nullopt;
}

} // namespace millpond
