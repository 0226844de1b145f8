#include "recording/recording_writer.hpp"

#include "base/refusal.hpp"
#include "recording/whole_file.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <cmath>
#include <cstring>
#include <limits>
#include <sndfile.h>
#include <vector>

namespace millpond {
namespace {

struct Ending {
    std::string_view ending;
    Container container;
    int format;
};
constexpr std::array<Ending, 5> endings{{{".wav", Container::wav, SF_FORMAT_WAV},
                                         {".rf64", Container::rf64, SF_FORMAT_RF64},
                                         {".w64", Container::w64, SF_FORMAT_W64},
                                         {".flac", Container::flac, SF_FORMAT_FLAC},
                                         {".raw", Container::raw, SF_FORMAT_RAW | SF_ENDIAN_LITTLE}}};

int sndfile_format(const RecordingFormat& format) {
    const auto container =
        std::find_if(endings.begin(), endings.end(), [&](const Ending& e) { return e.container == format.container; });
    const int subtype = format.encoding == Encoding::int16   ? SF_FORMAT_PCM_16
                        : format.encoding == Encoding::int24 ? SF_FORMAT_PCM_24
                        : format.encoding == Encoding::int32 ? SF_FORMAT_PCM_32
                                                             : SF_FORMAT_FLOAT;
    return container->format | subtype;
}

void check(const std::string& where, const RecordingFormat& format, const Channels& channels, Hertz rate) {
    const bool integers = integer_bits(format.encoding) != 0;
    if (format.encoding == Encoding::unsaid || channels.empty()) {
        throw Refusal(where, "no encoding or no channels", "an encoding and at least one channel");
    }
    if (integers && !(format.microvolts_per_count > 0.0 && std::isfinite(format.microvolts_per_count))) {
        throw Refusal(where, fmt::format("{} microvolts a count", format.microvolts_per_count),
                      "a number above 0 for integer samples");
    }
    if (format.container == Container::flac && (!integers || format.encoding == Encoding::int32)) {
        throw Refusal(where, "an encoding that FLAC does not hold", "int16 or int24 for .flac");
    }
    if (format.container == Container::flac && format.mode == WriteMode::crash_safe) {
        throw Refusal(where, "FLAC for a file that must survive a crash", "RF64, W64, WAV or raw");
    }
    if (format.container == Container::flac && channels.size() > 8) {
        throw Refusal(where, fmt::format("{} channels", channels.size()), "at most 8 channels for .flac");
    }
    if (format.container != Container::raw && (rate.value != std::floor(rate.value) || rate.value > 655350.0)) {
        throw Refusal(where, fmt::format("{} frames a second", rate.value), "a whole number, or a .raw file");
    }
}

} // namespace

Container container_for(const std::filesystem::path& recording) {
    auto ending = recording.extension().string();
    std::transform(ending.begin(), ending.end(), ending.begin(),
                   [](unsigned char letter) { return static_cast<char>(std::tolower(letter)); });
    for (const auto& known : endings) {
        if (known.ending == ending) {
            return known.container;
        }
    }
    throw Refusal(recording.string(), "the ending '" + ending + "'",
                  "a name ending in .wav, .rf64, .w64, .flac or .raw");
}

struct RecordingWriter::State {
    std::filesystem::path recording;
    std::filesystem::path written_to;
    RecordingFormat format;
    Sidecar sidecar;
    std::size_t channels = 0;
    SNDFILE* file = nullptr;
    std::uint64_t frames = 0;
    std::uint64_t clipped = 0;
    std::vector<int> counts;

    [[nodiscard]] std::uint64_t frame_bytes() const {
        const int bits = integer_bits(format.encoding);
        return channels * static_cast<std::uint64_t>(bits == 0 ? 4 : bits / 8);
    }

    int count_for(float microvolts) {
        if (!std::isfinite(microvolts)) {
            throw Refusal(recording.string(), "a sample that is not finite", "encoding float32, which can hold it");
        }
        // The reader multiplies by the scale as float: divide by the same number, so that counts come back as they
        // were.
        const double count = std::nearbyint(static_cast<double>(microvolts) /
                                            static_cast<double>(static_cast<float>(format.microvolts_per_count)));
        const double most = std::ldexp(1.0, integer_bits(format.encoding) - 1) - 1.0;
        const double kept = std::clamp(count, -most - 1.0, most);
        clipped += kept == count ? 0 : 1;
        return static_cast<int>(kept);
    }

    sf_count_t write(std::span<const float> block) {
        const auto count = static_cast<sf_count_t>(block.size() / channels);
        const int bits = integer_bits(format.encoding);
        if (bits == 0) {
            return sf_writef_float(file, block.data(), count);
        }
        counts.resize(block.size());
        for (std::size_t i = 0; i < block.size(); ++i) {
            counts[i] = static_cast<int>(static_cast<unsigned>(count_for(block[i])) << (32 - bits));
        }
        return sf_writef_int(file, counts.data(), count);
    }
};

RecordingWriter::RecordingWriter(const std::filesystem::path& recording, const RecordingFormat& format,
                                 const Channels& channels, Hertz rate, bool overwrite)
    : state_(std::make_unique<State>()) {
    check(recording.string(), format, channels, rate);
    if (!overwrite && std::filesystem::exists(recording)) {
        throw Refusal(recording.string(), "a recording that exists", "a new name, or leave to overwrite it");
    }
    const bool whole = format.mode == WriteMode::whole;
    const bool integers = integer_bits(format.encoding) != 0;
    const bool raw = format.container == Container::raw;
    auto& state = *state_;
    state.recording = recording;
    state.written_to = whole ? unfinished_path(recording) : recording;
    state.format = format;
    state.channels = channels.size();
    state.sidecar = Sidecar{integers ? format.microvolts_per_count : 0.0, channels, raw ? rate.value : 0.0,
                            raw ? static_cast<int>(channels.size()) : 0, raw ? format.encoding : Encoding::unsaid};
    SF_INFO info{};
    info.samplerate = std::max(1, static_cast<int>(rate.value));
    info.channels = static_cast<int>(channels.size());
    info.format = sndfile_format(format);
    if (!whole) {
        write_sidecar(sidecar_path(recording), state.sidecar);
    }
    state.file = sf_open(state.written_to.c_str(), SFM_WRITE, &info);
    if (state.file == nullptr) {
        throw Refusal(recording.string(), std::string("no way to write it (") + sf_strerror(nullptr) + ")",
                      "a place with room and the right to write");
    }
    // The peak chunk carries the time of day: the same samples would give other bytes.
    sf_command(state.file, SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
    if (!whole && !raw) {
        sf_command(state.file, SFC_SET_UPDATE_HEADER_AUTO, nullptr, SF_TRUE);
        sf_command(state.file, SFC_UPDATE_HEADER_NOW, nullptr, 0);
    }
}

RecordingWriter::RecordingWriter(RecordingWriter&&) noexcept = default;

RecordingWriter::~RecordingWriter() {
    if (!state_ || state_->file == nullptr) {
        return;
    }
    sf_close(state_->file);
    if (state_->format.mode == WriteMode::whole) {
        std::error_code ignored;
        std::filesystem::remove(state_->written_to, ignored);
    }
}

void RecordingWriter::write(std::span<const float> frames) {
    auto& state = *state_;
    const auto count = frames.size() / state.channels;
    if (state.format.container == Container::wav &&
        (state.frames + count) * state.frame_bytes() > std::numeric_limits<std::uint32_t>::max() - 4096) {
        throw Refusal(state.recording.string(), "more than 4 GiB", "the ending .rf64 or .w64 for so long a recording");
    }
    // At most this much at once: the buffer for counts stays small however long the block is.
    const std::size_t step = std::max<std::size_t>(1, 16384 / state.channels);
    for (std::size_t done = 0; done < count; done += step) {
        const auto chunk = std::min(step, count - done);
        if (state.write(frames.subspan(done * state.channels, chunk * state.channels)) !=
            static_cast<sf_count_t>(chunk)) {
            throw Refusal(state.recording.string(), std::string("a failed write (") + sf_strerror(state.file) + ")",
                          "a disk with room");
        }
        state.frames += chunk;
    }
}

void RecordingWriter::finish() {
    auto& state = *state_;
    const int closed = sf_close(state.file);
    state.file = nullptr;
    if (closed != 0) {
        throw Refusal(state.recording.string(), "a file that could not be closed", "a disk with room");
    }
    if (state.format.mode == WriteMode::whole) {
        write_sidecar(sidecar_path(state.recording), state.sidecar);
        std::filesystem::rename(state.written_to, state.recording);
    }
}

std::uint64_t RecordingWriter::frames() const noexcept {
    return state_->frames;
}

std::uint64_t RecordingWriter::clipped() const noexcept {
    return state_->clipped;
}

} // namespace millpond
