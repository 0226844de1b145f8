// What a user may say about where commands come from. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <string>

namespace millpond {

struct ControlSettings {
    bool listen = false;
    std::string listen_address = "127.0.0.1";
    std::uint16_t port = 9001;
    bool allow_other_hosts = false;
    std::string secret;

    bool operator==(const ControlSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, ControlSettings& control) {
    visit.flag("listen", control.listen,
               "whether OSC commands are taken: /arm, /disarm, /stop, /clear, /mark TEXT, /gate NAME 1 or 0, /epoch, "
               "/speed NUMBER, /trial");
    visit.text("listen_address", control.listen_address, "IPv4 address that commands are taken on");
    visit.whole("port", control.port, {1, 65535}, "UDP port that commands are taken on");
    visit.flag("allow_other_hosts", control.allow_other_hosts,
               "whether listen_address may be reached from other computers; needs a secret");
    visit.text("secret", control.secret,
               "where set, every command must carry it as its first argument, a string of at least 8 characters");
}

} // namespace millpond
