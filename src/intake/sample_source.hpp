// The role of everything that samples come from during a session.
// Thread: loop, after construction. A source allocates, locks, throws and formats nothing in `receive`.
#pragma once

#include "base/event.hpp"
#include "base/frames.hpp"

#include <array>
#include <cstdint>

namespace millpond {

enum class Received : std::uint8_t {
    frames,  ///< `arrival` holds a block
    nothing, ///< the time ran out
    ended,   ///< the source will deliver no more (end of standard input)
    failed   ///< the source is broken; the stream is lost
};

/// One block as it came in. The samples stay valid until the next call of `receive`.
struct Arrival {
    FrameBlock block;                           ///< microvolts; `first` counts missing frames too
    GapCause gap_cause = GapCause::packet_loss; ///< of frames missing before `block`, if any are
    std::int64_t arrived_ns = 0;                ///< kernel receive stamp, UTC since 1970; 0 where there is none
    std::int64_t sent_ns = 0;                   ///< sender's stamp, UTC since 1970; 0 where the packet carries none
    bool counts_changed = false;                ///< a cause other than `accepted` was counted since the last block
};

/// Packets by what became of them, since the start; index is PacketCause.
using PacketCounts = std::array<std::uint64_t, packet_cause_count>;

class SampleSource {
  public:
    virtual ~SampleSource() = default;

    /// Waits at most `timeout` (0: does not wait) and delivers at most one block, the oldest.
    virtual Received receive(Nanos timeout, Arrival& arrival) noexcept = 0;

    [[nodiscard]] virtual const PacketCounts& counts() const noexcept = 0;
    [[nodiscard]] virtual Hertz rate() const noexcept = 0;
    [[nodiscard]] virtual std::size_t channels() const noexcept = 0;
};

} // namespace millpond
