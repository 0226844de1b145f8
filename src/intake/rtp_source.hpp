// Samples from RTP packets by UDP: received, checked, put in order, decoded to microvolts.
// Thread: control makes it; loop calls receive. Errors: bad settings and a port in use throw Refusal from the
// constructor.
#pragma once

#include "intake/rtp_packet.hpp"
#include "intake/sample_source.hpp"
#include "intake/stream_order.hpp"
#include "intake/stream_settings.hpp"

#include <boost/asio/io_context.hpp>
#include <boost/asio/ip/udp.hpp>

#include <vector>

namespace millpond {

class RtpSource final : public SampleSource {
  public:
    /// Listens at once. `settings` is what `resolved` returned.
    explicit RtpSource(const StreamSettings& settings);

    /// Packets that cannot be used are counted and waited past, within the same `timeout`. A signal ends the wait
    /// early; a wait of 2 ms or more may end late by the kernel's tick (1 to 10 ms) where nothing comes.
    Received receive(Nanos timeout, Arrival& arrival) noexcept override;

    [[nodiscard]] const PacketCounts& counts() const noexcept override { return counts_; }
    [[nodiscard]] Hertz rate() const noexcept override { return rate_; }
    [[nodiscard]] std::size_t channels() const noexcept override { return channels_; }

    /// Packets that the kernel threw away since the start, its buffer being full. They are among the lost, too.
    [[nodiscard]] std::uint32_t kernel_drops() const noexcept { return kernel_drops_; }
    /// What the kernel granted of receive_buffer_bytes.
    [[nodiscard]] std::size_t receive_buffer_bytes() const;

  private:
    enum class Took : std::uint8_t {
        packet,
        nothing,
        interrupted,
        failed
    };
    struct Buffer {
        std::uint8_t* bytes = nullptr;
        std::span<const std::uint8_t> payload;
        std::int64_t arrived_ns = 0, sent_ns = 0;
    };

    void open(const StreamSettings& settings);
    [[nodiscard]] Took block_for_packet(Nanos wait) noexcept;
    [[nodiscard]] Took poll_for_packet(Nanos wait) noexcept;
    [[nodiscard]] Took read_packet(int flags) noexcept;
    [[nodiscard]] static Took took_nothing_because(int error) noexcept;
    void take_in(std::size_t bytes, std::int64_t arrived_ns) noexcept;
    void reclaim() noexcept;
    void hand_out(const StreamOrder::Ready& ready, Arrival& arrival) noexcept;
    [[nodiscard]] bool tell_troubles() noexcept;
    void count(PacketCause cause) noexcept { ++counts_[static_cast<std::size_t>(cause)]; }

    Hertz rate_;
    std::size_t channels_;
    SampleEncoding encoding_;
    float microvolts_per_count_;
    RtpExpectation expected_;
    std::size_t max_packet_bytes_;
    boost::asio::io_context context_;
    boost::asio::ip::udp::socket socket_{context_};
    int handle_ = -1;
    Nanos read_time_{0}; // what a blocking read waits at most
    PacketCounts counts_{};
    StreamOrder order_;
    std::vector<std::uint8_t> bytes_;
    std::vector<Buffer> buffers_;
    std::vector<std::uint32_t> free_; // the last one takes the next packet
    std::vector<float> samples_;
    std::uint64_t troubles_told_ = 0;
    std::uint32_t kernel_drops_ = 0;
};

} // namespace millpond
