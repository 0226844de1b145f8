#include "control/command_listener.hpp"

#include "base/clock.hpp"
#include "base/refusal.hpp"

#include <boost/asio/buffer.hpp>
#include <boost/asio/ip/address_v4.hpp>

namespace millpond {
namespace {

using boost::asio::ip::udp;

constexpr std::size_t least_secret = 8;

} // namespace

void check_control(const ControlSettings& settings, const std::string& where) {
    boost::system::error_code trouble;
    const auto address = boost::asio::ip::make_address_v4(settings.listen_address.c_str(), trouble);
    if (trouble) {
        throw Refusal(where + "control.listen_address", "'" + settings.listen_address + "'", "a dotted IPv4 address");
    }
    if (!address.is_loopback() && !settings.allow_other_hosts) {
        throw Refusal(where + "control.listen_address", settings.listen_address,
                      "127.0.0.1, or control.allow_other_hosts: true");
    }
    if (!address.is_loopback() && settings.secret.empty()) {
        throw Refusal(where + "control.secret", "none", "a secret, since other computers can reach this address");
    }
    if (!settings.secret.empty() && settings.secret.size() < least_secret) {
        throw Refusal(where + "control.secret", std::to_string(settings.secret.size()) + " characters", "8 or more");
    }
}

CommandListener::CommandListener(boost::asio::io_context& context, const ControlSettings& settings,
                                 OscCommands vocabulary, CommandRing& commands, StopDoor door,
                                 std::function<void(const std::string&)> refused)
    : osc_(std::move(vocabulary)), commands_(commands), door_(std::move(door)), refused_(std::move(refused)),
      socket_(context, udp::v4()) {
    check_control(settings, "");
    boost::system::error_code trouble;
    const auto address = boost::asio::ip::make_address_v4(settings.listen_address.c_str());
    socket_.bind({address, settings.port}, trouble);
    if (trouble) {
        throw Refusal("control.port", std::to_string(settings.port) + " (" + trouble.message() + ")",
                      "a port that is free");
    }
    listen();
}

void CommandListener::listen() {
    socket_.async_receive_from(boost::asio::buffer(packet_), from_,
                               [this](const boost::system::error_code& trouble, std::size_t size) {
                                   if (trouble == boost::asio::error::operation_aborted) {
                                       return;
                                   }
                                   if (!trouble) {
                                       take({packet_.data(), size});
                                   }
                                   listen();
                               });
}

void CommandListener::take(std::span<const std::uint8_t> packet) {
    auto verdict = osc_.read(packet);
    if (!verdict.refusal.empty()) {
        refused_(verdict.refusal);
    } else if (verdict.command) {
        verdict.command->came = monotonic_now();
        verdict.command->by = {ChangeSource::command, from_.port(), from_.address().to_v4().to_uint()};
        obey(*verdict.command);
    }
}

void CommandListener::obey(Command command) {
    if (command.kind == CommandKind::stop) {
        door_.stop(command.by);
        return;
    }
    if (command.kind == CommandKind::arm && door_.stopped()) {
        refused_("OSC /arm: found an emergency stop; allowed: /clear first, when all is safe");
        return;
    }
    if (command.kind == CommandKind::clear) {
        door_.clear();
    }
    if (commands_.push(command) != PushOutcome::stored) {
        refused_("OSC command: found more commands than the loop takes; allowed: fewer at a time");
    }
}

} // namespace millpond
