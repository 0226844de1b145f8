// WAV, RF64, W64, FLAC and raw through libsndfile. Thread: cold.
#pragma once

#include "recording/recording_reader.hpp"
#include "recording/sidecar.hpp"

namespace millpond {

/// `raw`: the file has no header and the sidecar says everything. `sidecar_name` is for messages.
[[nodiscard]] std::unique_ptr<RecordingReader> open_sndfile(const std::filesystem::path& recording, bool raw,
                                                            const Sidecar& sidecar, const std::string& sidecar_name,
                                                            CutFile cut);

} // namespace millpond
