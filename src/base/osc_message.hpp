// Messages of Open Sound Control 1.0: encoded once at start-up for pulse orders, decoded as they come for commands.
// Source: The Open Sound Control 1.0 Specification (2002). Bundles are not taken: a command acts when it arrives.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <variant>
#include <vector>

namespace millpond {

using OscArgument = std::variant<std::int32_t, float, std::string>;

/// Address and arguments as bytes. Refuses an address that does not begin with / or holds characters that OSC reserves.
/// Thread: control.
[[nodiscard]] std::vector<std::uint8_t> encode_osc(const std::string& address,
                                                   const std::vector<OscArgument>& arguments, const std::string& where);

/// Words of a settings text as arguments: 1 is an int32, 1.0 a float32, all else a string. Thread: control.
[[nodiscard]] std::vector<OscArgument> osc_arguments(const std::string& words);

/// What is wrong with a packet.
enum class OscTrouble : std::uint8_t {
    none,
    not_a_message, ///< does not begin with /; bundles are this too
    cut_short,     ///< ends inside a string or an argument
    no_type_tags,  ///< the type tag string is missing
    unknown_type,  ///< an argument type other than i, f, s, T, F
    too_many       ///< more arguments than `OscMessage` holds
};
[[nodiscard]] std::string_view name_of(OscTrouble trouble) noexcept;

/// Views into the packet; valid as long as it is.
struct OscMessage {
    struct Value {
        char type = 0;          ///< i, f, s, T or F
        std::int32_t whole = 0; ///< i; T is 1, F is 0
        float number = 0.0F;    ///< f, and i as a float
        std::string_view text;  ///< s
    };
    std::string_view address;
    std::array<Value, 8> values;
    std::size_t count = 0;
};

/// Never reads outside `packet`. Thread: any; allocates nothing.
[[nodiscard]] OscTrouble decode_osc(std::span<const std::uint8_t> packet, OscMessage& message) noexcept;

} // namespace millpond
