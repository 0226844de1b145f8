// Pulse orders as OSC 1.0 messages over UDP, encoded before the session starts.
#pragma once

#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <boost/asio/io_context.hpp>
#include <boost/asio/ip/udp.hpp>

#include <cstdint>
#include <vector>

namespace millpond {

class OscOutput : public Output {
  public:
    /// Refuses addresses that are no IPv4 address, or not of this computer unless settings allow other hosts.
    /// Thread: control.
    explicit OscOutput(const OutputSettings& settings);

    /// One system call. Where the receiver is on this computer and gone, the kernel says so at the order after: that
    /// order is sent again at once, and false returned.
    bool set_line(bool high) noexcept override;

  private:
    bool send(const std::vector<std::uint8_t>& order) const noexcept;

    boost::asio::io_context context_;
    boost::asio::ip::udp::socket socket_;
    int descriptor_ = -1;
    std::vector<std::uint8_t> high_, low_;
};

} // namespace millpond
