// EDF and EDF+ (Kemp & Olivan 2003), and their 24-bit siblings, through EDFlib. Thread: cold, any number of threads:
// EDFlib is neither thread-safe nor able to open a file twice, so all use of it goes through one lock and shared
// handles.
#pragma once

#include "recording/recording_reader.hpp"
#include "recording/sidecar.hpp"

namespace millpond {

/// Whether the file begins as EDF or BDF files do.
[[nodiscard]] bool looks_like_edf(const std::filesystem::path& recording);

/// Physical values in microvolts, scaled by the sidecar's microvolts_per_count only where it says one.
/// Names and roles from the sidecar: where its names are labels of the file, by name, and signals that it does not list
/// are unused; else in order, as many as there are signals. Unused signals of another rate or unit are left out.
[[nodiscard]] std::unique_ptr<RecordingReader> open_edf(const std::filesystem::path& recording, const Sidecar& sidecar,
                                                        const std::string& sidecar_name);

} // namespace millpond
