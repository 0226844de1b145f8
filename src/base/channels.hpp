// Which channel of the stream is what. Thread: control makes it; constant afterwards.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <string>
#include <vector>

namespace millpond {

enum class ChannelRole : std::uint8_t {
    ripple,    ///< a site where ripples are looked for
    reference, ///< a site whose crossing says: not a ripple
    unused     ///< carried in the stream and stored, not looked at
};
inline constexpr Choice<ChannelRole> channel_roles[] = {
    {ChannelRole::ripple, "ripple"}, {ChannelRole::reference, "reference"}, {ChannelRole::unused, "unused"}};

struct Channel {
    std::string name;
    ChannelRole role = ChannelRole::ripple;

    bool operator==(const Channel&) const = default;
};

template <class Visitor> void describe(Visitor& visit, Channel& channel) {
    visit.text("name", channel.name, "what the channel is called in tables and reports");
    visit.choice("role", channel.role, channel_roles, "what the channel is for");
}

using Channels = std::vector<Channel>;

/// `count` channels in stream order, all of role ripple, named ch0, ch1, ...
[[nodiscard]] inline Channels ripple_channels(std::size_t count) {
    Channels channels;
    for (std::size_t i = 0; i < count; ++i) {
        channels.push_back({"ch" + std::to_string(i), ChannelRole::ripple});
    }
    return channels;
}

} // namespace millpond
