// From the rings to the disk: what the journal thread does every 20 ms.
#pragma once

#include "journal/disk_watch.hpp"
#include "journal/journal_sink.hpp"
#include "journal/latency_deltas.hpp"
#include "journal/live_figures.hpp"
#include "journal/record_file.hpp"
#include "journal/sample_file.hpp"
#include "journal/sample_ring.hpp"
#include "journal/session_writer.hpp"

#include <atomic>
#include <memory>
#include <optional>
#include <vector>

namespace millpond {

/// What other threads push into.
struct JournalRings {
    // 65536 loop events: minutes of an ordinary session, over 1 s of one event a sample at 50 kHz.
    JournalSink loop{65536}, pulse{4096}, control{4096};
    SpscRing<PacketTiming> timings{65536};
    std::optional<SampleRing> samples; ///< empty where samples are not stored
};

/// Thread: journal, except where said. After trouble it goes on: rings are drained, records are tried again.
class JournalDrain {
  public:
    /// Makes the files in `folder` and writes session_start. Thread: control.
    JournalDrain(const std::filesystem::path& folder, const SessionSettings& settings, const SessionAbout& about,
                 std::int64_t start_utc_ns);
    /// Thread: control, before the first drain.
    void watch_disk(const std::filesystem::path& folder, double min_free_mb);

    void drain();
    /// The last drain, session_end at `end`, all onto the disk.
    void finish(SampleIndex end);

    /// Each ring's producer side: its own thread.
    [[nodiscard]] JournalRings& rings() noexcept { return rings_; }
    /// Thread: any.
    [[nodiscard]] JournalTrouble trouble() const noexcept { return trouble_.load(std::memory_order_acquire); }
    /// Thread: any cold one.
    [[nodiscard]] LiveFigures figures() const { return counters_.figures(); }

  private:
    void collect_events();
    void collect_timings(Nanos now);
    void collect_dropped();
    void add_dropped(Dropped what, std::uint64_t count, SampleIndex at);
    void write_records();
    void store_samples();
    bool store_block(std::uint64_t& missing_budget);
    void lose_frames(std::uint64_t frames, SampleIndex at);
    void fail(JournalTrouble trouble, const std::string& what);
    void fail_disk(int error, const char* file);

    JournalRings rings_;
    std::size_t channels_;
    RecordFileWriter records_;
    std::optional<SampleFileWriter> samples_;
    LatencyDeltas latencies_;
    LiveCounters counters_;
    std::atomic<JournalTrouble> trouble_{JournalTrouble::none};
    std::atomic<bool> little_space_{false};

    std::vector<Event> batch_, pulse_events_, control_events_, loop_events_;
    std::vector<PacketTiming> timings_;
    SampleIndex upto_{};
    Nanos latencies_told_{};
    std::uint64_t events_dropped_ = 0, timings_dropped_ = 0, frames_dropped_ = 0; // by full rings, told so far
    std::uint64_t records_lost_ = 0, records_untold_ = 0;                         // by the disk
    std::uint64_t frames_lost_ = 0, frames_lost_told_ = 0;                        // by the disk
    SampleIndex first_frame_lost_{};
    bool ending_ = false;

    std::vector<float> block_; // taken from the ring, waiting to be written
    SampleIndex block_first_{};
    bool block_waits_ = false;

    std::unique_ptr<DiskWatch> watch_; // last: its thread ends before what it tells is gone
};

} // namespace millpond
