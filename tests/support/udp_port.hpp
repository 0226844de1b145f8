// Ports of this computer. Thread: test.
#pragma once

#include "support/files.hpp"

#include <algorithm>
#include <cstdint>
#include <cstdio>
#include <netinet/in.h>
#include <stdexcept>
#include <sys/socket.h>
#include <unistd.h>
#include <vector>

namespace millpond::test {

/// A UDP port of the loopback address that nobody had a moment ago; no port is given out twice in one process.
inline std::uint16_t free_udp_port() {
    static std::vector<std::uint16_t> given;
    for (int attempt = 0; attempt < 1000; ++attempt) {
        const int descriptor = ::socket(AF_INET, SOCK_DGRAM, 0);
        sockaddr_in address{};
        address.sin_family = AF_INET;
        address.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
        socklen_t size = sizeof address;
        const bool bound = ::bind(descriptor, reinterpret_cast<sockaddr*>(&address), size) == 0 &&
                           ::getsockname(descriptor, reinterpret_cast<sockaddr*>(&address), &size) == 0;
        ::close(descriptor);
        const std::uint16_t port = ntohs(address.sin_port);
        // ffmpeg wants an even port and takes the next for RTCP (RFC 3550, section 11).
        if (bound && port % 2 == 0 && std::find(given.begin(), given.end(), port) == given.end()) {
            given.push_back(port);
            return port;
        }
    }
    throw std::runtime_error("no free UDP port");
}

/// Whether somebody listens on a UDP port of this computer, by the kernel's own table.
inline bool udp_port_taken(int port) {
    char wanted[8];
    std::snprintf(wanted, sizeof wanted, ":%04X ", static_cast<unsigned>(port));
    const auto listed = [&wanted](const char* table) {
        return std::filesystem::exists(table) && text_of(table).find(wanted) != std::string::npos;
    };
    return listed("/proc/net/udp") || listed("/proc/net/udp6");
}

} // namespace millpond::test
