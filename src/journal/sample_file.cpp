#include "journal/sample_file.hpp"

#include "base/refusal.hpp"

#include <algorithm>
#include <cerrno>
#include <cmath>
#include <cstring>
#include <fcntl.h>
#include <limits>
#include <sndfile.h>
#include <unistd.h>
#include <vector>

namespace millpond {

std::filesystem::path sample_file_name(StoreSamples format) {
    return format == StoreSamples::w64 ? "samples.w64" : "samples.rf64";
}

struct SampleFileWriter::File {
    int fd = -1;
    SNDFILE* handle = nullptr;
    std::size_t channels = 0;
    std::uint64_t frames = 0, frames_in_header = UINT64_MAX;
    int error = 0;
    std::vector<float> missing; // a stretch of NaN to write from

    ~File() {
        if (handle != nullptr) {
            sf_close(handle);
        }
        if (fd >= 0) {
            ::close(fd);
        }
    }

    void cut_back() noexcept {
        error = errno != 0 ? errno : EIO;
        auto whole = static_cast<sf_count_t>(frames);
        sf_command(handle, SFC_FILE_TRUNCATE, &whole, sizeof whole);
        sf_command(handle, SFC_UPDATE_HEADER_NOW, nullptr, 0);
    }
};

SampleFileWriter::SampleFileWriter(const std::filesystem::path& file, StoreSamples format, Hertz rate,
                                   std::size_t channels)
    : file_(std::make_unique<File>()) {
    file_->fd = ::open(file.c_str(), O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0644);
    if (file_->fd < 0) {
        throw Refusal(file.string(), std::strerror(errno), "a new file that can be written");
    }
    SF_INFO info{};
    info.samplerate = static_cast<int>(std::lround(rate.value));
    info.channels = static_cast<int>(channels);
    info.format = SF_FORMAT_FLOAT | (format == StoreSamples::w64 ? SF_FORMAT_W64 : SF_FORMAT_RF64);
    file_->handle = sf_open_fd(file_->fd, SFM_WRITE, &info, SF_FALSE);
    if (file_->handle == nullptr) {
        throw Refusal(file.string(), sf_strerror(nullptr), "a rate and channel count that the format takes");
    }
    // No PEAK chunk: a not-a-number has no place in one.
    sf_command(file_->handle, SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
    file_->channels = channels;
    file_->missing.assign(std::max<std::size_t>(1, 65536 / channels) * channels,
                          std::numeric_limits<float>::quiet_NaN());
    if (!update_header()) {
        throw Refusal(file.string(), sf_strerror(file_->handle), "a disk with room for the session");
    }
}

SampleFileWriter::~SampleFileWriter() = default;

bool SampleFileWriter::write(std::span<const float> frames) noexcept {
    if (file_->error != 0) {
        return false;
    }
    const auto wanted = frames.size() / file_->channels;
    errno = 0;
    const auto wrote = sf_writef_float(file_->handle, frames.data(), static_cast<sf_count_t>(wanted));
    file_->frames += static_cast<std::uint64_t>(std::max<sf_count_t>(0, wrote));
    if (wrote != static_cast<sf_count_t>(wanted)) {
        file_->cut_back();
        return false;
    }
    return true;
}

bool SampleFileWriter::write_missing(std::uint64_t frames) noexcept {
    const auto stretch = file_->missing.size() / file_->channels;
    while (frames > 0) {
        const auto now = std::min<std::uint64_t>(frames, stretch);
        if (!write(std::span(file_->missing).first(now * file_->channels))) {
            return false;
        }
        frames -= now;
    }
    return true;
}

bool SampleFileWriter::update_header() noexcept {
    if (file_->error != 0) {
        return false;
    }
    if (file_->frames == file_->frames_in_header) {
        return true;
    }
    errno = 0;
    sf_command(file_->handle, SFC_UPDATE_HEADER_NOW, nullptr, 0);
    if (sf_error(file_->handle) != SF_ERR_NO_ERROR) {
        file_->cut_back();
        return false;
    }
    file_->frames_in_header = file_->frames;
    return true;
}

int SampleFileWriter::error() const noexcept {
    return file_->error;
}

std::uint64_t SampleFileWriter::frames() const noexcept {
    return file_->frames;
}

int SampleFileWriter::descriptor() const noexcept {
    return file_->fd;
}

struct SampleFileReader::File {
    SF_INFO info{};
    SNDFILE* handle = nullptr;
    ~File() {
        if (handle != nullptr) {
            sf_close(handle);
        }
    }
};

SampleFileReader::SampleFileReader(const std::filesystem::path& file) : file_(std::make_unique<File>()) {
    file_->handle = sf_open(file.c_str(), SFM_READ, &file_->info);
    if (file_->handle == nullptr) {
        throw Refusal(file.string(), sf_strerror(nullptr), "the stored samples of a session");
    }
}

SampleFileReader::~SampleFileReader() = default;
SampleFileReader::SampleFileReader(SampleFileReader&&) noexcept = default;
SampleFileReader& SampleFileReader::operator=(SampleFileReader&&) noexcept = default;

std::uint64_t SampleFileReader::frames() const noexcept {
    return static_cast<std::uint64_t>(file_->info.frames);
}

std::size_t SampleFileReader::channels() const noexcept {
    return static_cast<std::size_t>(file_->info.channels);
}

Hertz SampleFileReader::rate() const noexcept {
    return Hertz{static_cast<double>(file_->info.samplerate)};
}

void SampleFileReader::seek(SampleIndex to) {
    sf_seek(file_->handle, static_cast<sf_count_t>(to.value), SEEK_SET);
}

std::size_t SampleFileReader::read(std::span<float> data) {
    const auto wanted = static_cast<sf_count_t>(data.size() / channels());
    return static_cast<std::size_t>(std::max<sf_count_t>(0, sf_readf_float(file_->handle, data.data(), wanted)));
}

} // namespace millpond
