// Puts the packets of one RTP stream in order and in their place: which is next, what is missing before it, which are
// dropped and why. Knows neither sockets nor samples: it is told when a packet came and in which buffer it lies.
// Thread: loop. After construction nothing here allocates, locks, throws or formats.
#pragma once

#include "base/event.hpp"
#include "base/units.hpp"
#include "intake/sample_source.hpp"

#include <cstdint>
#include <vector>

namespace millpond {

struct OrderSettings {
    Hertz rate;
    Nanos reorder_wait{0};                        ///< how long packets wait for one missing before them
    Nanos restart_after{std::chrono::seconds{1}}; ///< silence, or jump of the time stamps, that ends a source
    std::size_t buffers = 1;                      ///< packets held at most
};

struct PacketPlace {
    std::uint32_t ssrc = 0;
    std::uint16_t sequence = 0;
    std::uint32_t timestamp = 0;
    std::uint32_t frames = 0; ///< at least 1
    Nanos arrived{0};         ///< by a clock that never goes back
};

/// The frame's place in the stream comes from the RTP time stamp alone, which counts frames (RFC 3551, 4.1); the
/// sequence number only counts what was lost and tells a repeat from a late packet. The first packet's first frame is
/// place 0.
///
/// A packet that fits nowhere (another SSRC after the known one fell silent, or a jump beyond `restart_after`) waits
/// for one that continues it: two in a row are a restart (compare RFC 3550, A.1), one alone is a stray, counted
/// wrong_source.
class StreamOrder {
  public:
    enum class Offer : std::uint8_t {
        held,   ///< the buffer now belongs to the order until `pop` or `take_freed` gives it back
        dropped ///< counted; the caller keeps the buffer
    };

    struct Ready {
        std::uint32_t buffer = 0;
        SampleIndex first;                          ///< place of the first frame to use
        std::uint32_t skip_frames = 0;              ///< frames at the packet's start that were delivered already
        GapCause gap_cause = GapCause::packet_loss; ///< of the frames missing before it, if any are
    };

    /// Counts by cause into `counts`, which must outlive it. `accepted` counts every packet that is delivered;
    /// `reordered` and `restarted` count some of them once more. `lost` is counted when the packet behind the missing
    /// one is delivered: a missing one that comes after all counts as `late` too.
    StreamOrder(const OrderSettings& settings, PacketCounts& counts);

    Offer offer(const PacketPlace& place, std::uint32_t buffer) noexcept;

    /// The next packet whose turn has come by `now`; false where there is none yet.
    bool pop(Nanos now, Ready& ready) noexcept;

    /// A buffer whose packet was dropped after it had been held; false where there is none.
    bool take_freed(std::uint32_t& buffer) noexcept;

    /// When the wait of the oldest packet held is over; Nanos::max() where none waits.
    [[nodiscard]] Nanos next_deadline() const noexcept;

    /// Where the next packet would stand if none is missing.
    [[nodiscard]] SampleIndex next_sample() const noexcept { return SampleIndex{static_cast<std::uint64_t>(next_)}; }

  private:
    struct Held {
        PacketPlace place;
        std::uint32_t buffer = 0;
        std::int64_t first = 0;    ///< place in the stream
        std::int64_t sequence = 0; ///< with the turns of its 16 bits
        bool restarted = false;
    };

    [[nodiscard]] Held placed(const PacketPlace& place, std::uint32_t buffer) const noexcept;
    [[nodiscard]] bool implausible(const Held& packet) const noexcept;
    [[nodiscard]] bool continues_candidate(const PacketPlace& place) const noexcept;
    [[nodiscard]] std::int64_t frames_in(Nanos time) const noexcept;
    [[nodiscard]] std::int64_t end_known() const noexcept;
    Offer hold_as_candidate(const PacketPlace& place, std::uint32_t buffer) noexcept;
    void begin(const PacketPlace& place, std::int64_t at) noexcept;
    void restart() noexcept;
    Offer insert(const Held& packet) noexcept;
    Offer drop_as_old(const Held& packet) noexcept;
    void drop_candidate() noexcept;
    void deliver(const Held& packet, Ready& ready) noexcept;
    void count(PacketCause cause, std::uint64_t how_many = 1) noexcept {
        counts_[static_cast<std::size_t>(cause)] += how_many;
    }

    OrderSettings settings_;
    PacketCounts& counts_;
    std::vector<Held> held_; // by place, first to last; room for all buffers is reserved
    std::vector<std::uint32_t> freed_;
    std::vector<std::int64_t> recent_sequences_; // ring by sequence: what was delivered or is held
    bool began_ = false;
    bool has_candidate_ = false;
    Held candidate_;
    std::uint32_t ssrc_ = 0;
    std::uint32_t anchor_timestamp_ = 0; // stands at place anchor_
    std::int64_t anchor_ = 0;
    std::int64_t next_ = 0;              // place behind the last frame delivered
    std::int64_t expected_sequence_ = 0; // behind the last packet delivered
    std::int64_t release_before_ = 0;    // packets of an ended source wait no longer
    Nanos last_arrived_{0};              // of the known source
};

} // namespace millpond
