#include "recording/recording_reader.hpp"

#include "base/refusal.hpp"
#include "recording/edf_reader.hpp"
#include "recording/sidecar.hpp"
#include "recording/sndfile_reader.hpp"

#include <algorithm>
#include <cctype>

namespace millpond {
namespace {

bool ends_as_raw(const std::filesystem::path& recording) {
    auto ending = recording.extension().string();
    std::transform(ending.begin(), ending.end(), ending.begin(),
                   [](unsigned char letter) { return static_cast<char>(std::tolower(letter)); });
    return ending == ".raw" || ending == ".bin" || ending == ".dat";
}

} // namespace

std::unique_ptr<RecordingReader> open_recording(const std::filesystem::path& recording,
                                                const std::filesystem::path& sidecar, CutFile cut) {
    if (!std::filesystem::is_regular_file(recording)) {
        throw Refusal(recording.string(), std::filesystem::exists(recording) ? "no regular file" : "no such file",
                      "a recording (WAV, RF64, W64, FLAC, raw, EDF+)");
    }
    const auto said = read_sidecar(recording, sidecar);
    const auto sidecar_name = (sidecar.empty() ? sidecar_path(recording) : sidecar).string();
    if (looks_like_edf(recording)) {
        return open_edf(recording, said, sidecar_name);
    }
    return open_sndfile(recording, ends_as_raw(recording), said, sidecar_name, cut);
}

LoadedRecording load_recording(const std::filesystem::path& recording, const std::filesystem::path& sidecar) {
    const auto reader = open_recording(recording, sidecar);
    LoadedRecording loaded{reader->info(), {}};
    const std::size_t channels = loaded.info.channels.size();
    loaded.data.resize(loaded.info.frames * channels);
    const std::size_t frames = reader->read(loaded.data);
    loaded.data.resize(frames * channels);
    loaded.info.frames = frames;
    return loaded;
}

} // namespace millpond
