#include "recording/sndfile_reader.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cstring>
#include <fstream>
#include <sndfile.h>

namespace millpond {
namespace {

struct Format {
    int subtype;
    Encoding encoding;
};
constexpr std::array<Format, 4> integer_and_float{{{SF_FORMAT_PCM_16, Encoding::int16},
                                                   {SF_FORMAT_PCM_24, Encoding::int24},
                                                   {SF_FORMAT_PCM_32, Encoding::int32},
                                                   {SF_FORMAT_FLOAT, Encoding::float32}}};

std::uint64_t little_endian(const unsigned char* bytes, int count) {
    std::uint64_t value = 0;
    for (int i = count - 1; i >= 0; --i) {
        value = (value << 8) | bytes[i];
    }
    return value;
}

/// Length of the whole file as its header has it; 0 where it does not say (FLAC, or a WAV written into a pipe).
/// WAV: RIFF chunk size; RF64 (EBU Tech 3306): ds64 chunk, which must come first; W64: size behind the first
/// identifier.
std::uint64_t length_in_header(const std::filesystem::path& recording) {
    std::array<unsigned char, 32> head{};
    std::ifstream in(recording, std::ios::binary);
    in.read(reinterpret_cast<char*>(head.data()), head.size());
    if (std::memcmp(head.data(), "RIFF", 4) == 0) {
        const auto size = little_endian(head.data() + 4, 4);
        return size == 0 || size == 0xFFFFFFFF ? 0 : size + 8;
    }
    if (std::memcmp(head.data(), "RF64", 4) == 0 && std::memcmp(head.data() + 12, "ds64", 4) == 0) {
        return little_endian(head.data() + 20, 8) + 8;
    }
    if (std::memcmp(head.data(), "riff", 4) == 0) {
        return little_endian(head.data() + 16, 8);
    }
    return 0;
}

void refuse_cut(const std::filesystem::path& recording) {
    const auto promised = length_in_header(recording);
    const auto there = std::filesystem::file_size(recording);
    // One byte of slack: writers disagree on whether the last padding byte is counted.
    if (promised > there + 1) {
        throw Refusal(recording.string(), fmt::format("a file cut short: {} bytes", there),
                      fmt::format("the {} bytes that its header says", promised));
    }
}

const char* container_name(int format) {
    switch (format & SF_FORMAT_TYPEMASK) {
    case SF_FORMAT_WAV:
    case SF_FORMAT_WAVEX:
        return "WAV";
    case SF_FORMAT_RF64:
        return "RF64";
    case SF_FORMAT_W64:
        return "W64";
    case SF_FORMAT_FLAC:
        return "FLAC";
    case SF_FORMAT_RAW:
        return "raw";
    default:
        return nullptr;
    }
}

class SndfileReader : public RecordingReader {
  public:
    SndfileReader(std::filesystem::path recording, const Sidecar& sidecar, const std::string& sidecar_name, bool raw)
        : recording_(std::move(recording)) {
        SF_INFO info{};
        if (raw) {
            require_raw_shape(sidecar, sidecar_name);
            info.format = raw_format(sidecar.encoding);
            // libsndfile's rate is whole; the sidecar's own is what counts.
            info.samplerate = std::max(1, static_cast<int>(sidecar.rate_hz));
            info.channels = raw_channels(sidecar);
        }
        file_.reset(sf_open(recording_.c_str(), SFM_READ, &info));
        if (!file_) {
            throw Refusal(recording_.string(), std::string("no recording (") + sf_strerror(nullptr) + ")",
                          "WAV, RF64, W64, FLAC, EDF+, or raw with the ending .raw, .bin or .dat");
        }
        take_format(info, sidecar, sidecar_name);
    }

    [[nodiscard]] const RecordingInfo& info() const noexcept override { return info_; }

    std::size_t read(std::span<float> frames) override {
        const auto channels = static_cast<sf_count_t>(info_.channels.size());
        const auto wanted = static_cast<sf_count_t>(frames.size()) / channels;
        sf_count_t got = 0;
        while (got < wanted) {
            const auto chunk = read_chunk(frames.subspan(static_cast<std::size_t>(got * channels)), wanted - got);
            if (chunk == 0) {
                break;
            }
            got += chunk;
        }
        place_ += static_cast<std::uint64_t>(got);
        if (got < wanted && place_ < info_.frames) {
            throw Refusal(recording_.string(), fmt::format("the end after frame {}", place_),
                          fmt::format("the {} frames that its header says", info_.frames));
        }
        return static_cast<std::size_t>(got);
    }

  private:
    struct Close {
        void operator()(SNDFILE* file) const noexcept { sf_close(file); }
    };

    void require_raw_shape(const Sidecar& sidecar, const std::string& sidecar_name) {
        const int channels = raw_channels(sidecar);
        if (sidecar.rate_hz == 0.0 || sidecar.encoding == Encoding::unsaid || channels == 0) {
            throw Refusal(recording_.string(), "a raw recording whose shape is not said",
                          "rate_hz, channel_count and encoding in " + sidecar_name);
        }
        const int sample_bytes = sidecar.encoding == Encoding::float32 ? 4 : integer_bits(sidecar.encoding) / 8;
        const auto frame_bytes = static_cast<std::uint64_t>(sample_bytes) * static_cast<std::uint64_t>(channels);
        if (const auto bytes = std::filesystem::file_size(recording_); bytes % frame_bytes != 0) {
            throw Refusal(
                recording_.string(), fmt::format("{} bytes", bytes),
                fmt::format("whole frames of {} bytes ({} channels as in {})", frame_bytes, channels, sidecar_name));
        }
    }

    static int raw_channels(const Sidecar& sidecar) {
        return sidecar.channel_count != 0 ? sidecar.channel_count : static_cast<int>(sidecar.channels.size());
    }

    static int raw_format(Encoding encoding) {
        for (const auto& format : integer_and_float) {
            if (format.encoding == encoding) {
                return SF_FORMAT_RAW | format.subtype | SF_ENDIAN_LITTLE;
            }
        }
        return 0;
    }

    void take_format(const SF_INFO& info, const Sidecar& sidecar, const std::string& sidecar_name) {
        const char* container = container_name(info.format);
        if (container == nullptr) {
            throw Refusal(recording_.string(), "another kind of sound file", "WAV, RF64, W64, FLAC, raw or EDF+");
        }
        const int subtype = info.format & SF_FORMAT_SUBMASK;
        is_double_ = subtype == SF_FORMAT_DOUBLE;
        Encoding encoding = is_double_ ? Encoding::float32 : Encoding::unsaid;
        for (const auto& format : integer_and_float) {
            encoding = format.subtype == subtype ? format.encoding : encoding;
        }
        if (encoding == Encoding::unsaid) {
            throw Refusal(recording_.string(), "samples of another kind",
                          "integers of 16, 24 or 32 bits, float or double");
        }
        bits_ = integer_bits(encoding);
        const bool raw = (info.format & SF_FORMAT_TYPEMASK) == SF_FORMAT_RAW;
        info_.format = container;
        info_.rate = Hertz{raw ? sidecar.rate_hz : static_cast<double>(info.samplerate)};
        info_.frames = static_cast<std::uint64_t>(info.frames);
        if (!raw) {
            check_against_file(info, sidecar, sidecar_name);
        }
        info_.channels = named_channels(sidecar, sidecar_name, static_cast<std::size_t>(info.channels));
        take_scale(sidecar, sidecar_name);
    }

    void check_against_file(const SF_INFO& info, const Sidecar& sidecar, const std::string& sidecar_name) {
        if (sidecar.encoding != Encoding::unsaid) {
            throw Refusal(sidecar_name + ": encoding", "an encoding", "none: only raw files need one");
        }
        if (sidecar.rate_hz != 0.0 && sidecar.rate_hz != info_.rate.value) {
            throw Refusal(sidecar_name + ": rate_hz", fmt::format("{}", sidecar.rate_hz),
                          fmt::format("the {} that {} says", info_.rate.value, recording_.string()));
        }
        if (sidecar.channel_count != 0 && sidecar.channel_count != info.channels) {
            throw Refusal(sidecar_name + ": channel_count", fmt::format("{}", sidecar.channel_count),
                          fmt::format("the {} that {} says", info.channels, recording_.string()));
        }
    }

    void take_scale(const Sidecar& sidecar, const std::string& sidecar_name) {
        if (bits_ != 0 && sidecar.microvolts_per_count == 0.0) {
            throw Refusal(recording_.string(), "integer samples of no known scale",
                          "microvolts_per_count (of one count) in " + sidecar_name);
        }
        scale_ = sidecar.microvolts_per_count == 0.0 ? 1.0 : sidecar.microvolts_per_count;
    }

    sf_count_t read_chunk(std::span<float> out, sf_count_t frames) {
        if (is_double_) {
            return read_as<double>(out, frames, sf_readf_double,
                                   [this](double value) { return static_cast<float>(value * scale_); });
        }
        const auto scale = static_cast<float>(scale_);
        if (bits_ == 0) {
            return read_as<float>(out, frames, sf_readf_float, [scale](float value) { return value * scale; });
        }
        // libsndfile hands integers out aligned to the left of 32 bits. One float multiplication of the count, as for a
        // count that came by RTP: the same bits either way.
        return read_as<int>(out, frames, sf_readf_int, [scale, shift = 32 - bits_](int value) {
            return static_cast<float>(value >> shift) * scale;
        });
    }

    template <class Stored, class Convert>
    sf_count_t read_as(std::span<float> out, sf_count_t frames,
                       sf_count_t (*read_frames)(SNDFILE*, Stored*, sf_count_t), Convert convert) {
        std::array<Stored, 8192> buffer;
        const auto channels = static_cast<sf_count_t>(info_.channels.size());
        const auto chunk = std::min(frames, static_cast<sf_count_t>(buffer.size()) / channels);
        const auto got = read_frames(file_.get(), buffer.data(), chunk);
        for (std::size_t i = 0; i < static_cast<std::size_t>(got * channels); ++i) {
            out[i] = convert(buffer[i]);
        }
        return got;
    }

    std::filesystem::path recording_;
    std::unique_ptr<SNDFILE, Close> file_;
    RecordingInfo info_;
    int bits_ = 0;
    bool is_double_ = false;
    double scale_ = 1.0;
    std::uint64_t place_ = 0;
};

} // namespace

std::unique_ptr<RecordingReader> open_sndfile(const std::filesystem::path& recording, bool raw, const Sidecar& sidecar,
                                              const std::string& sidecar_name, CutFile cut) {
    if (!raw && cut == CutFile::refused) {
        refuse_cut(recording);
    }
    return std::make_unique<SndfileReader>(recording, sidecar, sidecar_name, raw);
}

} // namespace millpond
