#include "intake/stream_order.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>

namespace millpond {
namespace {

constexpr std::size_t remembered_sequences = 4096; // over 0.1 s at one frame a packet and 30 kHz
constexpr std::int64_t greatest_candidate_step = 100;

} // namespace

StreamOrder::StreamOrder(const OrderSettings& settings, PacketCounts& counts)
    : settings_(settings), counts_(counts), recent_sequences_(remembered_sequences, -1) {
    assert(settings.rate.value > 0 && settings.buffers > 0);
    held_.reserve(settings.buffers + 1);
    freed_.reserve(settings.buffers + 1);
}

std::int64_t StreamOrder::frames_in(Nanos time) const noexcept {
    return std::llround(static_cast<double>(time.count()) * 1e-9 * settings_.rate.value);
}

// Behind all that was delivered or is held.
std::int64_t StreamOrder::end_known() const noexcept {
    return held_.empty() ? next_ : std::max(next_, held_.back().first + std::int64_t{held_.back().place.frames});
}

StreamOrder::Held StreamOrder::placed(const PacketPlace& place, std::uint32_t buffer) const noexcept {
    // Signed differences of 32 and 16 bits: right across the wrap.
    const auto frames_on = static_cast<std::int32_t>(place.timestamp - anchor_timestamp_);
    const auto packets_on =
        static_cast<std::int16_t>(place.sequence - static_cast<std::uint16_t>(expected_sequence_ & 0xffff));
    return {place, buffer, anchor_ + frames_on, expected_sequence_ + packets_on, false};
}

// A loss makes the time stamps jump as far as the clock went on meanwhile, not farther.
bool StreamOrder::implausible(const Held& packet) const noexcept {
    const std::int64_t limit = frames_in(settings_.restart_after);
    const std::int64_t clock_went = std::max<std::int64_t>(0, frames_in(packet.place.arrived - last_arrived_));
    return packet.first - end_known() > limit + clock_went || next_ - packet.first > limit;
}

StreamOrder::Offer StreamOrder::offer(const PacketPlace& place, std::uint32_t buffer) noexcept {
    assert(place.frames > 0);
    if (!began_) {
        begin(place, 0);
        return insert(placed(place, buffer));
    }
    if (has_candidate_ && continues_candidate(place)) {
        restart();
        last_arrived_ = std::max(last_arrived_, place.arrived);
        return insert(placed(place, buffer));
    }
    if (place.ssrc != ssrc_) {
        if (place.arrived - last_arrived_ >= settings_.restart_after) {
            return hold_as_candidate(place, buffer);
        }
        count(PacketCause::wrong_source);
        return Offer::dropped;
    }
    const auto packet = placed(place, buffer);
    if (implausible(packet)) {
        return hold_as_candidate(place, buffer);
    }
    drop_candidate();
    last_arrived_ = std::max(last_arrived_, place.arrived);
    return insert(packet);
}

bool StreamOrder::continues_candidate(const PacketPlace& place) const noexcept {
    const auto& before = candidate_.place;
    const auto packets_on = static_cast<std::int16_t>(place.sequence - before.sequence);
    const auto frames_on = static_cast<std::int32_t>(place.timestamp - before.timestamp);
    return place.ssrc == before.ssrc && packets_on >= 1 && packets_on <= greatest_candidate_step && frames_on >= 1 &&
           frames_on <= frames_in(settings_.restart_after) + std::int64_t{before.frames};
}

StreamOrder::Offer StreamOrder::hold_as_candidate(const PacketPlace& place, std::uint32_t buffer) noexcept {
    drop_candidate();
    candidate_.place = place;
    candidate_.buffer = buffer;
    has_candidate_ = true;
    return Offer::held;
}

void StreamOrder::drop_candidate() noexcept {
    if (has_candidate_) {
        has_candidate_ = false;
        freed_.push_back(candidate_.buffer);
        count(PacketCause::wrong_source);
    }
}

void StreamOrder::begin(const PacketPlace& place, std::int64_t at) noexcept {
    began_ = true;
    ssrc_ = place.ssrc;
    anchor_timestamp_ = place.timestamp;
    anchor_ = at;
    expected_sequence_ = 0x10000 + place.sequence; // one turn up, so that what lies before it is not negative
    last_arrived_ = place.arrived;
    std::fill(recent_sequences_.begin(), recent_sequences_.end(), -1);
}

// The new source's first packet stands as far behind the old one's end as the clock says, its own frames taken off; one
// frame at least, so that everybody downstream learns that the signal is not continuous.
void StreamOrder::restart() noexcept {
    const std::int64_t end = end_known();
    const std::int64_t went = frames_in(candidate_.place.arrived - last_arrived_);
    const std::int64_t missing = std::max<std::int64_t>(1, went - std::int64_t{candidate_.place.frames});
    release_before_ = end + missing;
    has_candidate_ = false;
    begin(candidate_.place, end + missing);
    Held first = placed(candidate_.place, candidate_.buffer);
    first.restarted = true;
    insert(first);
}

StreamOrder::Offer StreamOrder::drop_as_old(const Held& packet) noexcept {
    const auto slot = static_cast<std::size_t>(packet.sequence) % remembered_sequences;
    count(recent_sequences_[slot] == packet.sequence ? PacketCause::repeated : PacketCause::late);
    return Offer::dropped;
}

StreamOrder::Offer StreamOrder::insert(const Held& packet) noexcept {
    if (packet.first + std::int64_t{packet.place.frames} <= next_) {
        return drop_as_old(packet);
    }
    const auto behind = std::upper_bound(held_.begin(), held_.end(), packet.first,
                                         [](std::int64_t first, const Held& held) { return first < held.first; });
    if (behind != held_.begin() && std::prev(behind)->first == packet.first) {
        count(PacketCause::repeated);
        return Offer::dropped;
    }
    if (behind != held_.end()) {
        count(PacketCause::reordered);
    }
    recent_sequences_[static_cast<std::size_t>(packet.sequence) % remembered_sequences] = packet.sequence;
    held_.insert(behind, packet);
    return Offer::held;
}

bool StreamOrder::pop(Nanos now, Ready& ready) noexcept {
    while (!held_.empty()) {
        const Held packet = held_.front();
        if (packet.first + std::int64_t{packet.place.frames} <= next_) {
            held_.erase(held_.begin()); // wholly covered by one that overlaps it
            freed_.push_back(packet.buffer);
            count(PacketCause::repeated);
            continue;
        }
        const bool in_turn = packet.first <= next_ || packet.first <= release_before_;
        const bool full = held_.size() >= settings_.buffers;
        const bool waits = settings_.reorder_wait > Nanos{0} && now - packet.place.arrived < settings_.reorder_wait;
        if (!in_turn && !full && waits) {
            return false;
        }
        held_.erase(held_.begin());
        deliver(packet, ready);
        return true;
    }
    return false;
}

void StreamOrder::deliver(const Held& packet, Ready& ready) noexcept {
    const bool of_running_source = packet.first >= release_before_;
    if (packet.restarted) {
        count(PacketCause::restarted);
    } else if (of_running_source && packet.sequence > expected_sequence_) {
        count(PacketCause::lost, static_cast<std::uint64_t>(packet.sequence - expected_sequence_));
    }
    count(PacketCause::accepted);
    const std::int64_t first = std::max(packet.first, next_);
    ready = {packet.buffer, SampleIndex{static_cast<std::uint64_t>(first)},
             static_cast<std::uint32_t>(first - packet.first),
             packet.restarted ? GapCause::source_restart : GapCause::packet_loss};
    next_ = packet.first + std::int64_t{packet.place.frames};
    if (of_running_source) {
        expected_sequence_ = packet.sequence + 1;
        anchor_ = next_;
        anchor_timestamp_ = packet.place.timestamp + packet.place.frames;
    }
}

bool StreamOrder::take_freed(std::uint32_t& buffer) noexcept {
    if (freed_.empty()) {
        return false;
    }
    buffer = freed_.back();
    freed_.pop_back();
    return true;
}

Nanos StreamOrder::next_deadline() const noexcept {
    if (held_.empty()) {
        return Nanos::max();
    }
    return held_.front().place.arrived + settings_.reorder_wait;
}

} // namespace millpond
