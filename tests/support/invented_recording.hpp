// A small invented recording with ripples at known places, as a WAV of float microvolts and its table. For tests.
#pragma once

#include "recording/recording_writer.hpp"
#include "support/scipy.hpp"

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
        data.resize(static_cast<std::size_t>(seconds * rate.value) * channels);
        std::uint64_t state = 99;
        for (auto& value : data) {
            double sum = -6.0;
            for (int i = 0; i < 12; ++i) { // twelve uniform numbers make a fair Gaussian
                state = state * 6364136223846793005U + 1442695040888963407U;
                sum += static_cast<double>(state >> 11U) * 0x1.0p-53;
            }
            value = static_cast<float>(noise_uv * sum);
        }
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

inline void write_text(const std::filesystem::path& file, const std::string& text) {
    std::ofstream(file) << text;
}

/// Exit status of the program with these arguments; what it says goes to `said`, where given.
inline int run_millpond(const std::string& arguments, std::string* said = nullptr) {
    const std::string command = std::string(MILLPOND_PROGRAM) + " " + arguments + " 2>&1";
    FILE* pipe = popen(command.c_str(), "r");
    char part[4096];
    for (std::size_t n = 0; (n = std::fread(part, 1, sizeof part, pipe)) > 0;) {
        if (said != nullptr) {
            said->append(part, n);
        }
    }
    return WEXITSTATUS(pclose(pipe));
}

} // namespace millpond::test
