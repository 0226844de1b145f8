// Reads a session folder, closed or cut. Thread: cold.
#pragma once

#include "journal/provenance.hpp"
#include "journal/record_file.hpp"
#include "journal/sample_file.hpp"

#include <filesystem>
#include <optional>
#include <span>
#include <vector>

namespace millpond {

class SessionReader {
  public:
    /// Reads provenance and all records. Refuses what is no session folder.
    explicit SessionReader(const std::filesystem::path& folder);

    [[nodiscard]] const std::filesystem::path& folder() const noexcept { return folder_; }
    [[nodiscard]] const Provenance& provenance() const noexcept { return provenance_; }
    [[nodiscard]] Hertz rate() const noexcept { return provenance_.about.rate; }
    [[nodiscard]] std::filesystem::path settings_file() const;

    /// Of all intact records, in the order in which they were written.
    [[nodiscard]] const std::vector<Event>& events() const noexcept { return records_.events; }
    [[nodiscard]] const std::vector<RecordDamage>& damage() const noexcept { return records_.damage; }
    /// The session never came to its end: the last record is no session_end.
    [[nodiscard]] bool cut() const noexcept { return !records_.closed; }
    /// Bytes of a last record that was only partly written.
    [[nodiscard]] std::uint64_t torn_bytes() const noexcept { return records_.torn_bytes; }
    /// Up to where (not including) the records tell all: the end of a closed session, the last place spoken of in a cut
    /// one.
    [[nodiscard]] SampleIndex end() const noexcept { return end_; }

    /// Empty where the session stored none.
    [[nodiscard]] std::optional<SampleFileReader> open_samples() const;

  private:
    std::filesystem::path folder_;
    Provenance provenance_;
    ReadRecords records_;
    SampleIndex end_{};
};

/// The newest floor of each site while gates were open, or, where there is none, the newest at all; by site, the mean
/// over sites (65535) last: what a later session can start from.
[[nodiscard]] std::vector<FloorDetail> last_floors(std::span<const Event> events);

/// Up to its zero, or all 32 characters.
[[nodiscard]] std::string gate_name(const GateDetail& gate);

/// The same of an epoch.
[[nodiscard]] std::string epoch_name(const EpochDetail& epoch);
/// "command from 127.0.0.1:50123", or the source alone.
[[nodiscard]] std::string told(const ChangedBy& by);

/// A note's whole text and where it stood, put together again.
struct Note {
    SampleIndex sample;
    std::int64_t time_ns = 0;
    std::string text;
};
[[nodiscard]] std::vector<Note> notes_in(std::span<const Event> events);

} // namespace millpond
