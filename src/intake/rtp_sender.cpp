#include "intake/rtp_sender.hpp"

#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "intake/ntp_time.hpp"
#include "intake/rtp_packet.hpp"

#include <boost/asio/buffer.hpp>

#include <algorithm>
#include <cassert>
#include <cerrno>
#include <ctime>
#include <random>

namespace millpond {
namespace {

namespace asio = boost::asio;

constexpr std::size_t greatest_udp_payload = 65507; // 65535 less the IPv4 and UDP headers

} // namespace

RtpSender::RtpSender(const RtpSenderSettings& settings) : settings_(settings) {
    const std::size_t frame_bytes = settings.stream.channels * bytes_per_sample(settings.stream.encoding);
    const std::size_t header = rtp_header_bytes(settings.stream.send_time_id != 0);
    if (settings.frames_per_packet == 0 || header + settings.frames_per_packet * frame_bytes > greatest_udp_payload) {
        throw Refusal("packet",
                      std::to_string(settings.frames_per_packet) + " frames of " + std::to_string(frame_bytes) +
                          " bytes",
                      "1 to " + std::to_string((greatest_udp_payload - header) / frame_bytes) + " frames a packet");
    }
    bytes_.resize(header + settings.frames_per_packet * frame_bytes);
    std::random_device random;
    sequence_ = static_cast<std::uint16_t>(random());
    timestamp_ = static_cast<std::uint32_t>(random());
    ssrc_ = static_cast<std::uint32_t>(random());
    boost::system::error_code trouble;
    const auto address = asio::ip::make_address_v4(settings.stream.address.c_str(), trouble);
    if (!trouble) {
        socket_.connect({address, settings.stream.port}, trouble);
    }
    if (trouble) {
        throw Refusal("destination",
                      settings.stream.address + ":" + std::to_string(settings.stream.port) + " (" + trouble.message() +
                          ")",
                      "an IPv4 address and port that can be reached");
    }
}

void RtpSender::send(std::span<const float> microvolts) {
    const std::size_t frames = microvolts.size() / settings_.stream.channels;
    assert(frames > 0 && frames <= settings_.frames_per_packet);
    const std::uint8_t send_time_id = settings_.stream.send_time_id;
    const std::size_t header = rtp_header_bytes(send_time_id != 0);
    const std::size_t payload = microvolts.size() * bytes_per_sample(settings_.stream.encoding);
    encode_samples(settings_.stream.encoding, microvolts, settings_.microvolts_per_count,
                   std::span(bytes_).subspan(header, payload), counts_.losses);
    RtpPacket packet;
    packet.payload_type = settings_.stream.payload_type;
    packet.sequence = sequence_++;
    packet.timestamp = timestamp_;
    packet.ssrc = ssrc_;
    timestamp_ += static_cast<std::uint32_t>(frames);
    counts_.frames += frames;
    const std::uint64_t number = counts_.packets + counts_.left_out + counts_.refused + 1;
    if (settings_.lose_every != 0 && number % settings_.lose_every == 0) {
        ++counts_.left_out;
        return;
    }
    packet.send_time_ntp = ntp_from_unix_ns(realtime_now().count()); // last, so that it counts nothing of the above
    write_rtp_header(packet, send_time_id, bytes_);
    boost::system::error_code trouble;
    socket_.send(asio::buffer(bytes_.data(), header + payload), 0, trouble);
    ++(trouble ? counts_.refused : counts_.packets);
}

Pace::Pace(Hertz rate, double speed) : ns_per_frame_(1e9 / (rate.value * speed)), start_(monotonic_now()) {
    assert(rate.value > 0 && speed > 0);
}

bool Pace::wait_for(std::uint64_t frame) {
    const Nanos due = start_ + Nanos{static_cast<std::int64_t>(static_cast<double>(frame) * ns_per_frame_)};
    const timespec time{due.count() / 1'000'000'000, due.count() % 1'000'000'000};
    if (clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &time, nullptr) == EINTR) {
        return false;
    }
    most_late_ = std::max(most_late_, monotonic_now() - due);
    return true;
}

} // namespace millpond
