// The samples of a session, as the engine saw them: float32 microvolts in RF64 or W64, file frame = place in the
// stream. Thread: the writer in the journal thread; the reader anywhere cold.
#pragma once

#include "base/units.hpp"
#include "journal/session_settings.hpp"

#include <cstdint>
#include <filesystem>
#include <memory>
#include <span>

namespace millpond {

/// `samples.rf64` or `samples.w64`.
[[nodiscard]] std::filesystem::path sample_file_name(StoreSamples format);

/// The header is brought up to date by `update_header`, so that a file cut short is readable up to the last call.
class SampleFileWriter {
  public:
    /// Refuses where the file exists or cannot be made.
    SampleFileWriter(const std::filesystem::path& file, StoreSamples format, Hertz rate, std::size_t channels);
    ~SampleFileWriter();
    SampleFileWriter(const SampleFileWriter&) = delete;
    SampleFileWriter& operator=(const SampleFileWriter&) = delete;

    /// False where the disk took less: the file is then cut back to its last whole frame and takes no more.
    bool write(std::span<const float> frames) noexcept;
    /// Frames that never came: NaN on every channel, which the engine takes as a gap.
    bool write_missing(std::uint64_t frames) noexcept;
    /// The same answer; costs nothing where no frame came since the last call.
    bool update_header() noexcept;
    /// errno of what failed; 0 while nothing did.
    [[nodiscard]] int error() const noexcept;

    [[nodiscard]] std::uint64_t frames() const noexcept;
    [[nodiscard]] int descriptor() const noexcept;

  private:
    struct File;
    std::unique_ptr<File> file_;
};

class SampleFileReader {
  public:
    /// Refuses what libsndfile cannot read.
    explicit SampleFileReader(const std::filesystem::path& file);
    ~SampleFileReader();
    SampleFileReader(SampleFileReader&&) noexcept;
    SampleFileReader& operator=(SampleFileReader&&) noexcept;

    [[nodiscard]] std::uint64_t frames() const noexcept;
    [[nodiscard]] std::size_t channels() const noexcept;
    [[nodiscard]] Hertz rate() const noexcept;
    void seek(SampleIndex to);
    /// Fills `data` (a multiple of `channels`) from where the last call ended; fewer frames than asked for only at the
    /// end.
    std::size_t read(std::span<float> data);

  private:
    struct File;
    std::unique_ptr<File> file_;
};

} // namespace millpond
