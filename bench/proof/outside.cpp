#include "proof/outside.hpp"

#include "proof/clairvoyant.hpp"
#include "recording/recording_reader.hpp"
#include "synth/scene.hpp"

#include <algorithm>
#include <cmath>

namespace millpond::bench {
namespace {

constexpr std::uint64_t seeds_apart = 1000000; // of one repeat from the next

SceneSettings ripples_alone(const Outside& outside, std::uint64_t seed) {
    SceneSettings settings;
    settings.duration_s = static_cast<double>(outside.once.size()) / outside.rate.value;
    settings.rate_hz = outside.rate.value;
    settings.sites = 1;
    settings.seed = seed;
    settings.quiet_start_s = 0.5;
    settings.background.rms_uv = settings.background.amplifier_uv = 0.0;
    settings.sharp_wave.amplitude_uv = 0.0;
    return settings;
}

ProofRecording injected_once(const Outside& outside, std::uint64_t seed, std::size_t repeats, double scale) {
    ProofRecording recording{outside.channels, outside.rate, {}, {}, {}, {}};
    for (std::size_t repeat = 0; repeat < repeats; ++repeat) {
        const auto one = invented(ripples_alone(outside, seed + repeat * seeds_apart), Split::whole);
        const auto offset = recording.data.size();
        for (auto ripple : one.truth) {
            ripple.onset = ripple.onset + offset;
            ripple.peak = ripple.peak + offset;
            ripple.end = ripple.end + offset;
            ripple.peak_envelope *= scale;
            recording.truth.push_back(ripple);
        }
        for (std::size_t i = 0; i < outside.once.size(); ++i) {
            const float ripple = one.data[i] * static_cast<float>(scale);
            recording.ripples.push_back(ripple);
            recording.data.push_back(outside.once[i] + ripple);
        }
        recording.data[offset] = std::nanf("");
    }
    return recording;
}

} // namespace

Outside load_outside(const std::filesystem::path& file) {
    const auto loaded = load_recording(file);
    Outside outside{file.filename().string(), ripple_channels(1), loaded.info.rate, {}};
    const auto channels = loaded.info.channels.size();
    for (std::size_t i = 0; i < loaded.data.size(); i += channels) {
        outside.once.push_back(loaded.data[i]);
    }
    return outside;
}

std::vector<ProofRecording> injected(const Outside& outside, std::uint64_t first_seed, std::size_t seeds,
                                     std::size_t repeats, double scale) {
    std::vector<ProofRecording> recordings(seeds);
    in_parallel(seeds, [&](std::size_t i) { recordings[i] = injected_once(outside, first_seed + i, repeats, scale); });
    return recordings;
}

double scale_for(const Outside& outside, std::uint64_t seed, std::size_t repeats, double share) {
    const Whitener whitener(outside.once, 1);
    const auto recording = injected_once(outside, seed, repeats, 1.0);
    double low = 0.05, high = 20.0;
    for (int step = 0; step < 12; ++step) {
        const double middle = std::sqrt(low * high);
        (clairvoyant_counts(recording, whitener, 1.0, middle).hit_rate() < share ? low : high) = middle;
    }
    return std::sqrt(low * high);
}

Curve outside_floor(const Outside& outside, const std::vector<ProofRecording>& recordings,
                    std::span<const double> false_per_minute) {
    const Whitener whitener(outside.once, 1);
    return clairvoyant_floor(recordings, whitener, false_per_minute);
}

Outside turned(const Outside& outside) {
    auto other = outside;
    std::rotate(other.once.begin(), other.once.begin() + static_cast<std::ptrdiff_t>(other.once.size() / 2),
                other.once.end());
    return other;
}

} // namespace millpond::bench
