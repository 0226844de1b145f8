// Writes recordings: WAV, RF64, W64, FLAC and raw through libsndfile, with the sidecar that makes them whole.
// Thread: cold (one at a time). Throws Refusal where the format cannot hold what is asked, or the disk is full.
#pragma once

#include "base/channels.hpp"
#include "base/units.hpp"
#include "recording/sidecar.hpp"

#include <cstdint>
#include <filesystem>
#include <memory>
#include <span>

namespace millpond {

enum class Container : std::uint8_t {
    wav,  ///< up to 4 GiB
    rf64, ///< WAV without the limit (EBU Tech 3306)
    w64,  ///< likewise, older
    flac, ///< compressed without loss; integers of 16 or 24 bits, at most 8 channels
    raw   ///< samples alone, little endian
};

/// By the ending of the file's name: .wav, .rf64, .w64, .flac, .raw; others are refused.
[[nodiscard]] Container container_for(const std::filesystem::path& recording);

enum class WriteMode : std::uint8_t {
    whole,      ///< under another name until `finish`: never half a recording
    crash_safe, ///< under its own name, the header brought up to date with every write: readable after kill -9
};

struct RecordingFormat {
    Container container = Container::wav;
    Encoding encoding = Encoding::float32; ///< float32: microvolts as they are, non-finite ones too
    double microvolts_per_count = 0.0;     ///< integer encodings: one count; counts are rounded to the nearest
    WriteMode mode = WriteMode::whole;
};

class RecordingWriter {
  public:
    /// Refuses an existing recording unless `overwrite`, and what the container cannot hold.
    RecordingWriter(const std::filesystem::path& recording, const RecordingFormat& format, const Channels& channels,
                    Hertz rate, bool overwrite = false);
    /// Without `finish` before: removes the unfinished file (mode whole), or leaves it as it is (crash_safe).
    ~RecordingWriter();
    RecordingWriter(RecordingWriter&&) noexcept;
    RecordingWriter& operator=(RecordingWriter&&) = delete;

    /// `frames`: microvolts, a multiple of the channel count, shape as in base/frames.hpp.
    /// Integer encodings refuse non-finite samples; samples beyond their range are clipped and counted.
    void write(std::span<const float> frames);

    /// Closes the file and gives it its name. The sidecar is written then (whole) or was from the start (crash_safe).
    void finish();

    [[nodiscard]] std::uint64_t frames() const noexcept;
    /// Samples that were clipped so far.
    [[nodiscard]] std::uint64_t clipped() const noexcept;

  private:
    struct State;
    std::unique_ptr<State> state_;
};

} // namespace millpond
