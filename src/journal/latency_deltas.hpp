// Packet timings on their way into the records: counted here, told as latency_bins events that add up.
// Thread: journal.
#pragma once

#include "base/histogram.hpp"
#include "journal/journal_sink.hpp"

#include <algorithm>
#include <array>
#include <tuple>
#include <utility>
#include <vector>

namespace millpond {

class LatencyDeltas {
  public:
    void add(const PacketTiming& timing) {
        add(LatencyPart::transport, timing.transport_ns);
        add(LatencyPart::wake, timing.wake_ns);
        add(LatencyPart::loop, timing.loop_ns);
    }

    /// Appends what was counted since the last call to `events`, at `at`.
    void flush(SampleIndex at, std::int64_t time_ns, std::vector<Event>& events) {
        for (std::size_t part = 0; part < latency_part_count; ++part) {
            auto& list = touched_[part];
            for (std::size_t from = 0; from < list.size(); from += bins_per_event) {
                LatencyBins some{};
                for (std::size_t i = from; i < std::min(from + bins_per_event, list.size()); ++i) {
                    some.bins[i - from] = {list[i], std::exchange(counts_[part][list[i]], 0U)};
                }
                events.push_back(Event::make(EventKind::latency_bins, static_cast<std::uint8_t>(part), at, some));
                events.back().time_ns = time_ns;
            }
            list.clear();
        }
    }

  private:
    static constexpr std::size_t bins_per_event = std::tuple_size_v<decltype(LatencyBins::bins)>;

    void add(LatencyPart part, std::int64_t ns) {
        if (ns == PulseDetail::not_measured) {
            return;
        }
        const auto index = static_cast<std::size_t>(part);
        const auto bin = LatencyHistogram::bin_of(ns);
        if (counts_[index][bin]++ == 0) {
            touched_[index].push_back(bin);
        }
    }

    std::array<std::array<std::uint32_t, LatencyHistogram::bin_count>, latency_part_count> counts_{};
    std::array<std::vector<std::uint32_t>, latency_part_count> touched_;
};

} // namespace millpond
