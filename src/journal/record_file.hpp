// The file of records of a session: append-only, fixed size, a checksum each. Byte by byte in src/journal/README.md.
// Thread: the writer in the journal thread; the reader anywhere cold.
#pragma once

#include "base/event.hpp"
#include "base/units.hpp"

#include <array>
#include <cstdint>
#include <filesystem>
#include <span>
#include <string>
#include <vector>

namespace millpond {

inline constexpr std::uint32_t record_format_version = 1;
inline constexpr std::size_t record_header_bytes = 64;
inline constexpr std::size_t record_bytes = 72; ///< checksum 4, mark 4, event 64

/// What the file itself says about the session.
struct RecordHeader {
    std::uint32_t channels = 0;
    Hertz rate;
    std::int64_t start_utc_ns = 0;

    bool operator==(const RecordHeader&) const = default;
};

using RecordBytes = std::array<std::uint8_t, record_bytes>;
[[nodiscard]] RecordBytes encode_record(const Event& event) noexcept;

/// What became of an append.
struct Appended {
    std::size_t records = 0; ///< whole records now in the file
    int error = 0;           ///< errno where that is fewer than asked for
};

/// Appends records with write(2), no buffer in between: what was appended survives the end of the process.
class RecordFileWriter {
  public:
    /// Makes the file and writes its header. Refuses where it exists or cannot be made.
    RecordFileWriter(const std::filesystem::path& file, const RecordHeader& header);
    RecordFileWriter(const RecordFileWriter&) = delete;
    RecordFileWriter& operator=(const RecordFileWriter&) = delete;
    ~RecordFileWriter();

    /// Sets the events' sequence numbers, which count on from the last append. Never leaves part of a record: on
    /// trouble the file is cut back to its last whole one.
    Appended append(std::span<Event> events);

    [[nodiscard]] std::uint64_t records() const noexcept { return records_; }
    /// For fdatasync.
    [[nodiscard]] int descriptor() const noexcept { return fd_; }

  private:
    int fd_ = -1;
    std::uint64_t records_ = 0;
    std::vector<std::uint8_t> bytes_;
};

/// One place where the file is not as it was written.
struct RecordDamage {
    std::uint64_t record; ///< counted from 0; UINT64_MAX for the file's header
    std::uint64_t byte;   ///< offset in the file
    std::string what;

    bool operator==(const RecordDamage&) const = default;
};

struct ReadRecords {
    RecordHeader header;
    bool header_intact = true;
    std::vector<Event> events;        ///< of all intact records, in file order
    std::vector<RecordDamage> damage; ///< records that are not among `events`
    std::uint64_t torn_bytes = 0;     ///< of a last record that was cut short
    bool closed = false;              ///< the last record is a session_end
};

/// Reads all, checks all, goes on after damage. Refuses what is no such file or of a version unknown here.
[[nodiscard]] ReadRecords read_records(const std::filesystem::path& file);

} // namespace millpond
