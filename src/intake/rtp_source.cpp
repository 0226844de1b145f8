#include "intake/rtp_source.hpp"

#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "intake/ntp_time.hpp"

#include <algorithm>
#include <array>
#include <cerrno>
#include <cstring>
#include <numeric>
#include <poll.h>
#include <sys/socket.h>
#include <utility>

namespace millpond {
namespace {

namespace asio = boost::asio;

constexpr std::size_t reorder_buffers = 64;
constexpr Nanos shortest_blocking_read = std::chrono::milliseconds{2};
constexpr Nanos oldest_stamp = std::chrono::seconds{60}; // an older one tells that the clock was set

OrderSettings order_settings(const StreamSettings& settings) {
    const auto nanos = [](double ms) { return Nanos{static_cast<std::int64_t>(ms * 1e6)}; };
    return {Hertz{settings.rate_hz}, nanos(settings.reorder_wait_ms), nanos(settings.restart_after_ms),
            settings.reorder_wait_ms > 0.0 ? reorder_buffers : 2};
}

struct Notes {
    std::int64_t arrived_ns = 0;
    bool has_drops = false;
    std::uint32_t drops = 0;
};

Notes read_notes(msghdr& message) noexcept {
    Notes notes;
    for (cmsghdr* note = CMSG_FIRSTHDR(&message); note != nullptr; note = CMSG_NXTHDR(&message, note)) {
        if (note->cmsg_level != SOL_SOCKET) {
            continue;
        }
        if (note->cmsg_type == SCM_TIMESTAMPNS) {
            timespec stamp{};
            std::memcpy(&stamp, CMSG_DATA(note), sizeof stamp);
            notes.arrived_ns = std::int64_t{stamp.tv_sec} * 1'000'000'000 + stamp.tv_nsec;
        } else if (note->cmsg_type == SO_RXQ_OVFL) {
            std::memcpy(&notes.drops, CMSG_DATA(note), sizeof notes.drops);
            notes.has_drops = true;
        }
    }
    return notes;
}

} // namespace

RtpSource::RtpSource(const StreamSettings& settings)
    : rate_{settings.rate_hz}, channels_(settings.channels), encoding_(settings.encoding),
      microvolts_per_count_(static_cast<float>(settings.microvolts_per_count)), expected_{settings.payload_type,
                                                                                          settings.send_time_extension},
      max_packet_bytes_(settings.max_packet_bytes), order_(order_settings(settings), counts_) {
    const std::size_t count = order_settings(settings).buffers + 2; // one waits as a candidate, one takes the next
    bytes_.resize(count * max_packet_bytes_);
    buffers_.resize(count);
    for (std::size_t i = 0; i < count; ++i) {
        buffers_[i].bytes = bytes_.data() + i * max_packet_bytes_;
    }
    free_.resize(count);
    std::iota(free_.begin(), free_.end(), 0U);
    samples_.resize(max_packet_bytes_ / bytes_per_sample(encoding_));
    open(settings);
}

void RtpSource::open(const StreamSettings& settings) {
    boost::system::error_code trouble;
    const asio::ip::udp::endpoint here(asio::ip::make_address_v4(settings.listen_address), settings.port);
    socket_.open(asio::ip::udp::v4());
    handle_ = socket_.native_handle();
    socket_.set_option(asio::socket_base::receive_buffer_size(static_cast<int>(settings.receive_buffer_bytes)),
                       trouble);
    const int on = 1;
    if (setsockopt(handle_, SOL_SOCKET, SO_TIMESTAMPNS, &on, sizeof on) != 0 ||
        setsockopt(handle_, SOL_SOCKET, SO_RXQ_OVFL, &on, sizeof on) != 0) {
        throw Refusal("stream", "a kernel without receive time stamps", "Linux with SO_TIMESTAMPNS and SO_RXQ_OVFL");
    }
    if (socket_.bind(here, trouble); trouble) {
        throw Refusal("stream.listen_address, stream.port",
                      settings.listen_address + ":" + std::to_string(settings.port) + " (" + trouble.message() + ")",
                      "an address of this computer and a port that nobody else listens on");
    }
}

std::size_t RtpSource::receive_buffer_bytes() const {
    asio::socket_base::receive_buffer_size granted;
    socket_.get_option(granted);
    return static_cast<std::size_t>(granted.value()) / 2; // Linux tells twice the size, its book-keeping included
}

Received RtpSource::receive(Nanos timeout, Arrival& arrival) noexcept {
    Nanos now = monotonic_now();
    const Nanos until = now + timeout;
    for (bool first_try = true;; first_try = false) {
        if (StreamOrder::Ready ready; order_.pop(now, ready)) {
            hand_out(ready, arrival);
            return Received::frames;
        }
        const Nanos deadline = std::min(until, order_.next_deadline());
        if (!first_try && now >= until) {
            arrival.counts_changed = tell_troubles();
            return Received::nothing;
        }
        const bool whole_wait = first_try && deadline == until;
        switch (whole_wait && timeout >= shortest_blocking_read ? block_for_packet(timeout)
                                                                : poll_for_packet(deadline - now)) {
        case Took::failed:
            return Received::failed;
        case Took::interrupted:
            arrival.counts_changed = tell_troubles();
            return Received::nothing;
        case Took::packet:
        case Took::nothing:
            now = monotonic_now();
        }
    }
}

// One system call a packet where asking, polling and reading are three: median round trip over loopback 22 to 25 us
// against 34 to 37 us (two shared cores, 1 ms packets). But the kernel keeps this time to its tick only, so that short
// waits and the rest of a wait are polled.
RtpSource::Took RtpSource::block_for_packet(Nanos wait) noexcept {
    if (wait != read_time_) {
        const auto micros = std::chrono::duration_cast<std::chrono::microseconds>(wait).count();
        const timeval time{micros / 1'000'000, micros % 1'000'000};
        if (setsockopt(handle_, SOL_SOCKET, SO_RCVTIMEO, &time, sizeof time) != 0) {
            return poll_for_packet(wait);
        }
        read_time_ = wait;
    }
    return read_packet(0);
}

RtpSource::Took RtpSource::poll_for_packet(Nanos wait) noexcept {
    const Took took = read_packet(MSG_DONTWAIT);
    if (took != Took::nothing || wait <= Nanos{0}) {
        return took;
    }
    pollfd readable{handle_, POLLIN, 0};
    const timespec time{wait.count() / 1'000'000'000, wait.count() % 1'000'000'000};
    const int found = ppoll(&readable, 1, &time, nullptr);
    if (found == 0) {
        return Took::nothing;
    }
    return found < 0 ? took_nothing_because(errno) : read_packet(MSG_DONTWAIT);
}

RtpSource::Took RtpSource::took_nothing_because(int error) noexcept {
    if (error == EINTR) {
        return Took::interrupted;
    }
    return error == EAGAIN || error == EWOULDBLOCK ? Took::nothing : Took::failed;
}

RtpSource::Took RtpSource::read_packet(int flags) noexcept {
    alignas(cmsghdr) std::array<char, 128> notes_bytes;
    iovec part{buffers_[free_.back()].bytes, max_packet_bytes_};
    msghdr message{};
    message.msg_iov = &part;
    message.msg_iovlen = 1;
    message.msg_control = notes_bytes.data();
    message.msg_controllen = notes_bytes.size();
    const ssize_t bytes = recvmsg(handle_, &message, flags);
    if (bytes < 0) {
        return took_nothing_because(errno);
    }
    const Notes notes = read_notes(message);
    if (notes.has_drops) {
        kernel_drops_ = notes.drops;
    }
    if ((message.msg_flags & MSG_TRUNC) != 0) {
        count(PacketCause::oversized);
    } else {
        take_in(static_cast<std::size_t>(bytes), notes.arrived_ns);
    }
    return Took::packet;
}

void RtpSource::take_in(std::size_t bytes, std::int64_t arrived_ns) noexcept {
    const std::uint32_t index = free_.back();
    Buffer& buffer = buffers_[index];
    RtpPacket packet;
    if (const auto cause = parse_rtp({buffer.bytes, bytes}, expected_, packet); cause != PacketCause::accepted) {
        return count(cause);
    }
    const std::size_t frame_bytes = channels_ * bytes_per_sample(encoding_);
    if (packet.payload.empty() || packet.payload.size() % frame_bytes != 0) {
        return count(PacketCause::wrong_length);
    }
    buffer.payload = packet.payload;
    buffer.arrived_ns = arrived_ns;
    buffer.sent_ns = packet.send_time_ntp == 0 ? 0 : unix_ns_from_ntp(packet.send_time_ntp);
    // The order needs a clock that is never set back: the stamp's age is taken off the monotonic time.
    const Nanos now = monotonic_now();
    const Nanos age =
        arrived_ns == 0 ? Nanos{0} : std::clamp(realtime_now() - Nanos{arrived_ns}, Nanos{0}, oldest_stamp);
    const PacketPlace place{packet.ssrc, packet.sequence, packet.timestamp,
                            static_cast<std::uint32_t>(packet.payload.size() / frame_bytes), now - age};
    if (order_.offer(place, index) == StreamOrder::Offer::held) {
        free_.pop_back();
    }
    reclaim();
}

void RtpSource::reclaim() noexcept {
    for (std::uint32_t freed = 0; order_.take_freed(freed);) {
        free_.push_back(freed);
    }
}

void RtpSource::hand_out(const StreamOrder::Ready& ready, Arrival& arrival) noexcept {
    const Buffer& buffer = buffers_[ready.buffer];
    const std::size_t width = bytes_per_sample(encoding_);
    const auto payload = buffer.payload.subspan(ready.skip_frames * channels_ * width);
    const std::span<float> samples(samples_.data(), payload.size() / width);
    decode_samples(encoding_, payload, microvolts_per_count_, samples);
    arrival.block = {ready.first, channels_, samples};
    arrival.gap_cause = ready.gap_cause;
    arrival.arrived_ns = buffer.arrived_ns;
    arrival.sent_ns = buffer.sent_ns;
    arrival.counts_changed = tell_troubles();
    free_.push_back(ready.buffer);
    reclaim();
}

bool RtpSource::tell_troubles() noexcept {
    const auto troubles = std::accumulate(counts_.begin() + 1, counts_.end(), std::uint64_t{0}); // all but `accepted`
    return std::exchange(troubles_told_, troubles) != troubles;
}

} // namespace millpond
