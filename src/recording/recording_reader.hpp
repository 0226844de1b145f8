// Reads recordings as frames in microvolts: WAV, RF64, W64, FLAC and raw through libsndfile, EDF+ through EDFlib.
// Thread: cold. Bad files throw Refusal.
#pragma once

#include "base/channels.hpp"
#include "base/units.hpp"
#include "recording/events_table.hpp"

#include <cstdint>
#include <filesystem>
#include <memory>
#include <span>
#include <string>
#include <vector>

namespace millpond {

struct RecordingInfo {
    std::string format; ///< "WAV", "RF64", "W64", "FLAC", "raw", "EDF", "EDF+", "BDF" or "BDF+"
    Hertz rate;
    Channels channels; ///< in file order
    std::uint64_t frames = 0;
};

class RecordingReader {
  public:
    virtual ~RecordingReader() = default;
    [[nodiscard]] virtual const RecordingInfo& info() const noexcept = 0;

    /// Fills `frames` (a multiple of the channel count; microvolts; shape as in base/frames.hpp) from where the last
    /// call ended and returns the frames read, fewer than asked for only at the end. A damaged file throws Refusal.
    virtual std::size_t read(std::span<float> frames) = 0;
};

/// What to do with a file that is shorter than its own header says.
enum class CutFile : std::uint8_t {
    refused,      ///< a copy broke off: copy it again
    read_as_it_is ///< what is there is read; for the audit of a session that was cut
};

/// Opens by content and ending. What the file itself does not say (scale to microvolts, names, roles; rate, channels
/// and encoding of raw) comes from `sidecar`, or, where that is empty, from RECORDING.yaml beside it where there is
/// one. Without either, numbers are taken as microvolts for float files and refused for integer ones (no scale is
/// known).
[[nodiscard]] std::unique_ptr<RecordingReader> open_recording(const std::filesystem::path& recording,
                                                              const std::filesystem::path& sidecar = {},
                                                              CutFile cut = CutFile::refused);

/// All of it at once, for recordings that fit in memory.
struct LoadedRecording {
    RecordingInfo info;
    std::vector<float> data;
};
[[nodiscard]] LoadedRecording load_recording(const std::filesystem::path& recording,
                                             const std::filesystem::path& sidecar = {});

/// The annotations of an EDF+ file as events: onset from the first sample, the annotation's text as trial_type.
[[nodiscard]] std::vector<TableEvent> read_edf_annotations(const std::filesystem::path& recording);

} // namespace millpond
