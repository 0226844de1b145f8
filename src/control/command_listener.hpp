// Listens for OSC commands by UDP and hands them to the loop. Thread: control, inside its io_context.
#pragma once

#include "base/spsc_ring.hpp"
#include "control/command.hpp"
#include "control/control_settings.hpp"
#include "control/osc_commands.hpp"

#include <boost/asio/io_context.hpp>
#include <boost/asio/ip/udp.hpp>

#include <array>
#include <cstdint>
#include <functional>
#include <string>

namespace millpond {

/// Control to loop; the loop empties it before each packet.
using CommandRing = SpscRing<Command>;

/// The short way past the ring, for what must not wait for the loop. Thread: control.
struct StopDoor {
    std::function<void(const ChangedBy&)> stop; ///< orders the line low, at once
    std::function<bool()> stopped;              ///< and nobody has cleared it yet
    std::function<void()> clear;
};

class CommandListener {
  public:
    /// Binds the socket. Refuses a port that is taken, an address that others can reach without allow_other_hosts and a
    /// secret, and a secret that is too short. `refused` takes the line that says why a packet was not taken.
    CommandListener(boost::asio::io_context& context, const ControlSettings& settings, OscCommands vocabulary,
                    CommandRing& commands, StopDoor door, std::function<void(const std::string&)> refused);

  private:
    void listen();
    void take(std::span<const std::uint8_t> packet);
    void obey(Command command);

    OscCommands osc_;
    CommandRing& commands_;
    StopDoor door_;
    std::function<void(const std::string&)> refused_;
    boost::asio::ip::udp::socket socket_;
    boost::asio::ip::udp::endpoint from_;
    std::array<std::uint8_t, 2048> packet_{};
};

/// The checks of the constructor that need no socket. `where` names the settings file.
void check_control(const ControlSettings& settings, const std::string& where);

} // namespace millpond
