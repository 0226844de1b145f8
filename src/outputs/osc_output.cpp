#include "outputs/osc_output.hpp"

#include "base/osc_message.hpp"
#include "base/refusal.hpp"

#include <boost/asio/ip/address_v4.hpp>

#include <sys/socket.h>

namespace millpond {
namespace {

using boost::asio::ip::udp;

udp::endpoint endpoint_of(const OutputSettings& settings) {
    boost::system::error_code trouble;
    const auto address = boost::asio::ip::make_address_v4(settings.host.c_str(), trouble);
    if (trouble) {
        throw Refusal(settings.where("host"), "'" + settings.host + "'", "a dotted IPv4 address");
    }
    if (!address.is_loopback() && !settings.allow_other_hosts) {
        throw Refusal(settings.where("host"), settings.host, "127.0.0.1, or allow_other_hosts: true");
    }
    return {address, settings.port};
}

} // namespace

OscOutput::OscOutput(const OutputSettings& settings)
    : socket_(context_, udp::v4()),
      high_(encode_osc(settings.address, osc_arguments(settings.high_arguments), settings.where("address"))),
      low_(encode_osc(settings.address, osc_arguments(settings.low_arguments), settings.where("address"))) {
    boost::system::error_code trouble;
    socket_.connect(endpoint_of(settings), trouble);
    if (trouble) {
        throw Refusal(settings.where("host"), settings.host + " (" + trouble.message() + ")",
                      "an address with a route to it");
    }
    descriptor_ = socket_.native_handle();
}

bool OscOutput::set_line(bool high) noexcept {
    const auto& order = high ? high_ : low_;
    // The first failure may be news of an earlier order; this one must go out all the same.
    return send(order) || (send(order), false);
}

bool OscOutput::send(const std::vector<std::uint8_t>& order) const noexcept {
    return ::send(descriptor_, order.data(), order.size(), MSG_DONTWAIT | MSG_NOSIGNAL) ==
           static_cast<ssize_t>(order.size());
}

} // namespace millpond
