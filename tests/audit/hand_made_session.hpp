// A session as a live loop would write it, over an invented signal whose bursts, gaps and commands are known.
#pragma once

#include "engine/engine.hpp"
#include "journal/record_file.hpp"
#include "journal/session_reader.hpp"
#include "journal/session_support.hpp"
#include "journal/session_writer.hpp"
#include "settings/settings.hpp"

#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>
#include <random>
#include <vector>

namespace millpond::test {

inline constexpr Hertz test_rate{1250.0};

/// Noise of 20 uV on two channels; every 700 ms a burst of 180 Hz, 60 ms long.
inline std::vector<float> bursts(std::size_t frames) {
    std::mt19937 random(7);
    std::normal_distribution<float> noise(0.0F, 20.0F);
    std::vector<float> data;
    for (std::size_t i = 0; i < frames; ++i) {
        const bool burst = i % 875 < 75 && i > 3000;
        const double phase = 2.0 * std::numbers::pi * 180.0 * static_cast<double>(i) / test_rate.value;
        const auto wave = burst ? static_cast<float>(200.0 * std::sin(phase)) : 0.0F;
        data.push_back(wave + noise(random));
        data.push_back(wave + noise(random));
    }
    return data;
}

inline EngineSettings test_engine_settings() {
    EngineSettings settings;
    settings.detector.method = DetectionMethod::envelope;
    settings.detector.floor.settle_s = 2.0;
    settings.detector.floor.time_constant_s = 5.0;
    settings.arbiter.start_armed = false;
    settings.arbiter.lockout_ms = 900.0; // longer than from one burst to the next: some are locked out
    settings.arbiter.gates = {{"still", true}};
    return settings;
}

/// Runs the engine over blocks as they would arrive, and journals and stores what a live loop would.
class HandMadeLoop {
  public:
    HandMadeLoop(const TemporaryFolder& temp, EngineSettings settings, std::vector<SampleIndex> schedule = {},
                 StoreSamples samples = StoreSamples::rf64, std::vector<FloorDetail> warm_start = {})
        : settings_(std::move(settings)),
          writer_(SessionWriter::open(session_in(temp, samples), about(settings_, warm_start))),
          engine_(detector(warm_start), settings_.arbiter, std::move(schedule), test_rate, writer_->loop_sink(),
                  port_) {
        engine_.start(SampleIndex{}, settings_.arbiter.start_armed);
    }

    void block(SampleIndex first, std::span<const float> data, GapCause cause = GapCause::packet_loss) {
        const FrameBlock block{first, 2, data};
        engine_.process(block, cause);
        if (store_) {
            writer_->store(block);
        }
    }
    void stop_storing() { store_ = false; }
    [[nodiscard]] Engine& engine() { return engine_; }
    [[nodiscard]] SessionWriter& writer() { return *writer_; }
    [[nodiscard]] const EngineSettings& settings() const { return settings_; }

    std::filesystem::path close() {
        const auto folder = writer_->folder();
        writer_->close(engine_.next_sample());
        return folder;
    }
    std::filesystem::path cut() {
        const auto folder = writer_->folder();
        writer_.reset();
        return folder;
    }

  private:
    static SessionAbout about(const EngineSettings& engine, const std::vector<FloorDetail>& warm_start) {
        auto about = about_stream(2, test_rate.value);
        Settings settings;
        settings.detector = engine.detector;
        settings.arbiter = engine.arbiter;
        about.settings_text = settings_to_yaml(settings);
        about.warm_start = warm_start;
        return about;
    }
    Detector detector(const std::vector<FloorDetail>& warm_start) const {
        auto made = Detector::make(settings_.detector, ripple_channels(2), test_rate);
        std::vector<FloorState> floors;
        for (const auto& floor : warm_start) {
            floors.push_back({floor.mean, floor.deviation, floor.frames});
        }
        if (!floors.empty()) {
            made.warm_start(floors);
        }
        return made;
    }

    EngineSettings settings_;
    std::unique_ptr<SessionWriter> writer_;
    NoPulsePort port_;
    Engine engine_;
    bool store_ = true;
};

/// 20 s with everything in it: not armed, armed, a closed gate, lost packets, not-a-number over several blocks, a
/// fault.
inline void run_eventful(HandMadeLoop& loop, std::size_t frames = 25'000) {
    auto data = bursts(frames);
    for (std::size_t i = 12'000; i < 12'050; ++i) {
        data[2 * i] = std::nanf("");
    }
    constexpr std::size_t block = 7;
    for (std::size_t at = 0; at + block <= frames; at += block) {
        if (at == 5'005) {
            loop.engine().set_state(ArmState::armed, StateCause::command);
        } else if (at == 9'002) {
            loop.engine().set_gate("still", false);
        } else if (at == 10'500) {
            loop.engine().set_gate("still", true);
        } else if (at == 18'004) {
            loop.engine().set_state(ArmState::faulted, StateCause::stale_stream);
        }
        if (at >= 14'000 && at < 14'210) {
            continue; // packets that never came
        }
        loop.block(SampleIndex{at}, std::span(data).subspan(2 * at, 2 * block));
    }
}

inline Event first_of(const std::filesystem::path& folder, EventKind kind) {
    const auto events = SessionReader(folder).events();
    return *std::find_if(events.begin(), events.end(), [kind](const Event& event) { return event.kind == kind; });
}

/// Replaces a record by another one, with a right checksum: what nobody but a forger does.
inline void forge_record(const std::filesystem::path& folder, const Event& event) {
    std::fstream io(folder / "records.mpj", std::ios::binary | std::ios::in | std::ios::out);
    io.seekp(static_cast<std::streamoff>(record_header_bytes + event.sequence * record_bytes));
    const auto record = encode_record(event);
    io.write(reinterpret_cast<const char*>(record.data()), static_cast<std::streamsize>(record.size()));
}

} // namespace millpond::test
