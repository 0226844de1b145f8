// Writes a session folder while the session runs: records and samples as they come, tables when it is closed.
// After the process is killed at any moment, all but the last 100 ms can be read.
#pragma once

#include "base/frames.hpp"
#include "journal/journal_sink.hpp"
#include "journal/live_figures.hpp"
#include "journal/provenance.hpp"
#include "journal/session_settings.hpp"

#include <filesystem>
#include <memory>

namespace millpond {

enum class JournalTrouble : std::uint8_t {
    none,         ///< all is being written
    disk_full,    ///< the disk takes no more: make room, end the session
    write_failed, ///< the disk refuses: look at it, end the session
    little_space, ///< less than session.min_free_mb is left; samples are no longer stored: make room, end the session
    fell_behind   ///< a ring was full, something was dropped: use a faster disk or store no samples
};

/// Events of one drain go to disk together, every 20 ms. Latencies are told every 60 ms.
class SessionWriter {
  public:
    /// Makes the folder and starts the journal thread. Refuses as NewSessionFolder does. Thread: control.
    static std::unique_ptr<SessionWriter> open(const SessionSettings& settings, const SessionAbout& about);
    /// Stops without the last event: the session then reads as cut.
    ~SessionWriter();
    SessionWriter(const SessionWriter&) = delete;
    SessionWriter& operator=(const SessionWriter&) = delete;

    // One sink for each thread that has something to say.
    [[nodiscard]] JournalSink& loop_sink() noexcept;
    [[nodiscard]] JournalSink& pulse_sink() noexcept;
    [[nodiscard]] JournalSink& control_sink() noexcept;

    /// The block as the engine saw it. Does nothing where samples are not stored. Thread: loop.
    void store(const FrameBlock& block) noexcept;
    /// Thread: loop.
    void time_packet(const PacketTiming& timing) noexcept;

    /// Other than none once evidence was or may be lost; stays so. The journal goes on draining. Thread: any.
    [[nodiscard]] JournalTrouble trouble() const noexcept;
    [[nodiscard]] bool failed() const noexcept { return trouble() != JournalTrouble::none; }

    /// Thread: control; blocks briefly.
    [[nodiscard]] LiveFigures snapshot() const;
    [[nodiscard]] const std::filesystem::path& folder() const noexcept;

    /// Drains, writes session_end at `end` (the engine's next sample), events.tsv and events.json. Call once the other
    /// threads have ended. Throws Refusal where the tables cannot be written; the records are safe by then.
    void close(SampleIndex end);

  private:
    struct State;
    explicit SessionWriter(std::unique_ptr<State> state) noexcept;
    std::unique_ptr<State> state_;
};

} // namespace millpond
