// Figures of the running session for a status line or a page.
#pragma once

#include "base/event.hpp"
#include "base/histogram.hpp"
#include "journal/journal_sink.hpp"

#include <array>
#include <cstdint>
#include <mutex>
#include <optional>
#include <string>
#include <vector>

namespace millpond {

/// An epoch of the plan, as its event said it.
struct LiveEpoch {
    std::uint16_t index = 0;
    std::string name;
    SampleIndex from;
    std::uint64_t frames = 0; ///< 0: until told
    bool pulses = false;
};

struct LiveFigures {
    std::uint64_t detections = 0, triggers = 0, pulses = 0, notes = 0;
    std::array<std::uint64_t, rule_count> withheld{}; ///< by Rule
    std::uint64_t gaps = 0, frames_missing = 0;
    std::array<std::uint64_t, packet_cause_count> packets{}; ///< by PacketCause
    std::uint64_t events_dropped = 0, frames_dropped = 0;    ///< rings were full, or the disk did not take them
    ArmState state = ArmState::not_armed;
    StateCause state_cause = StateCause::start;                 ///< what moved it there
    std::optional<LiveEpoch> epoch;                             ///< empty: no plan
    std::optional<double> speed;                                ///< newest told; in the unit of the settings
    std::vector<std::string> gates_closed;                      ///< by name
    SampleIndex upto;                                           ///< last place that an event or a stored frame spoke of
    std::vector<std::pair<std::uint16_t, SiteState>> sites_out; ///< channels left out of the evidence now, and why
    std::vector<FloorDetail> floors;                            ///< newest of each site, in order of first appearance
    /// Packet arrived to loop done with it, over the last 4 to 5 s; empty where nothing was measured.
    std::optional<std::int64_t> loop_p50_ns, loop_p99_ns;
    std::uint64_t records = 0; ///< written to disk
    std::string trouble;       ///< empty while all is well; else what happened and what to do
};

/// Counts as the journal drains.  Thread: `count`s from the journal, `figures` from any cold one; blocks briefly.
class LiveCounters {
  public:
    void count(const std::vector<Event>& events, const std::vector<PacketTiming>& timings, Nanos now);
    /// What the journal knows and no event says.
    void set_journal(std::uint64_t records, std::uint64_t events_dropped, std::uint64_t frames_dropped,
                     SampleIndex upto);
    void set_trouble(std::string trouble);
    [[nodiscard]] LiveFigures figures() const;

  private:
    void count_one(const Event& event);
    void turn_seconds(Nanos now);

    mutable std::mutex mutex_;
    LiveFigures figures_;
    std::array<LatencyHistogram, 5> loop_seconds_; // a ring of one second each
    std::size_t second_ = 0;
    Nanos second_began_{};
};

} // namespace millpond
