// A small invented recording with ripples at known places, as a WAV of float microvolts and its table. For tests.
#pragma once

#include "recording/events_table.hpp"
#include "recording/recording_writer.hpp"
#include "support/signals.hpp"

#include <cmath>
#include <cstdint>
#include <filesystem>
#include <limits>
#include <numbers>
#include <string>
#include <vector>

namespace millpond::test {

struct InventedRecording {
    Hertz rate{1250.0};
    std::size_t channels = 2;
    std::vector<float> data;
    std::vector<double> onsets_s;
    static constexpr double ripple_s = 0.08;

    /// Noise of 10 uV and a ripple of 150 uV every second from 15 s on, `jitter` apart from exact seconds.
    explicit InventedRecording(double seconds, double noise_uv = 10.0, double ripple_uv = 150.0) {
        data = white_noise(static_cast<std::size_t>(seconds * rate.value), channels, noise_uv, 99);
        for (double onset = 15.0; onset + 1.0 < seconds; onset += 1.0 + 0.1 * std::sin(7.0 * onset)) {
            add_ripple(onset, ripple_uv);
        }
    }

    void add_ripple(double onset_s, double amplitude) {
        onsets_s.push_back(onset_s);
        for (std::size_t f = 0; f < data.size() / channels; ++f) {
            const double t = static_cast<double>(f) / rate.value - onset_s;
            if (t >= 0.0 && t <= ripple_s) {
                const double hull = std::sin(std::numbers::pi * t / ripple_s);
                const auto value = static_cast<float>(amplitude * hull * std::cos(2.0 * std::numbers::pi * 180.0 * t));
                for (std::size_t c = 0; c < channels; ++c) {
                    data[f * channels + c] += value;
                }
            }
        }
    }

    void lose(double from_s, double to_s) {
        const auto from = static_cast<std::size_t>(from_s * rate.value) * channels;
        const auto to = static_cast<std::size_t>(to_s * rate.value) * channels;
        for (std::size_t i = from; i < to; ++i) {
            data[i] = std::numeric_limits<float>::quiet_NaN();
        }
    }

    void write(const std::filesystem::path& recording) const {
        RecordingWriter writer(recording, {}, ripple_channels(channels), rate);
        writer.write(data);
        writer.finish();
    }

    void write_truth(const std::filesystem::path& table) const {
        std::vector<TableEvent> rows;
        for (const double onset : onsets_s) {
            rows.push_back({onset, ripple_s, "ripple", std::llround(onset * rate.value), {}});
        }
        write_events_table(table, rows, {});
    }
};

} // namespace millpond::test
