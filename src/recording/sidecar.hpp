// What a recording's file does not say itself: scale, names, roles, and the whole shape of raw files. Thread: cold.
//
//     microvolts_per_count: 0.195
//     channels:
//       - {name: CA1-1, role: ripple}
//       - {name: cortex, role: reference}
//
// For raw files also, for example:
//
//     rate_hz: 1250
//     channel_count: 2
//     encoding: int16
#pragma once

#include "base/channels.hpp"
#include "base/describe.hpp"

#include <cstdint>
#include <filesystem>

namespace millpond {

/// How one sample is stored; in raw files little endian.
enum class Encoding : std::uint8_t {
    unsaid, ///< the file says it itself
    int16,
    int24,
    int32,
    float32
};
inline constexpr Choice<Encoding> encodings[] = {
    {Encoding::int16, "int16"}, {Encoding::int24, "int24"}, {Encoding::int32, "int32"}, {Encoding::float32, "float32"}};

/// Bits of one integer sample; 0 where samples are not integers.
constexpr int integer_bits(Encoding encoding) noexcept {
    return encoding == Encoding::int16 ? 16 : encoding == Encoding::int24 ? 24 : encoding == Encoding::int32 ? 32 : 0;
}

struct Sidecar {
    double microvolts_per_count = 0.0; ///< 0: not said
    Channels channels;                 ///< empty: not said
    double rate_hz = 0.0;              ///< 0: not said
    int channel_count = 0;             ///< 0: not said
    Encoding encoding = Encoding::unsaid;

    bool operator==(const Sidecar&) const = default;
};

template <class Visitor> void describe(Visitor& visit, Sidecar& sidecar) {
    visit.number(
        "microvolts_per_count", sidecar.microvolts_per_count, {-1e9, 1e9},
        "microvolts of one count (integer files), or of the value 1 (float files and EDF+: 1 where it is not said)");
    visit.list("channels", sidecar.channels, "channels in file order (EDF+: or by their labels)");
    visit.number("rate_hz", sidecar.rate_hz, {1.0, 1e6}, "frames a second (raw files)");
    visit.whole("channel_count", sidecar.channel_count, {1, 1024}, "channels (raw files; else as many as are listed)");
    visit.choice("encoding", sidecar.encoding, encodings, "how one sample is stored, little endian (raw files)");
}

/// RECORDING.yaml beside the recording.
[[nodiscard]] std::filesystem::path sidecar_path(const std::filesystem::path& recording);

/// RECORDING.truth.tsv beside the recording: where the ripples of an invented recording are.
[[nodiscard]] std::filesystem::path truth_path(const std::filesystem::path& recording);

/// Reads `sidecar`, or, where that is empty, the one beside the recording; nothing said where there is none.
/// Refuses unknown keys and two channels of one name.
[[nodiscard]] Sidecar read_sidecar(const std::filesystem::path& recording, const std::filesystem::path& sidecar);

/// Writes only what is said. Never leaves half a file.
void write_sidecar(const std::filesystem::path& sidecar, const Sidecar& said);

/// `channel_count` channels with the sidecar's names and roles; refuses a list of another length.
[[nodiscard]] Channels named_channels(const Sidecar& sidecar, const std::string& sidecar_name,
                                      std::size_t channel_count);

} // namespace millpond
