#include "base/osc_message.hpp"

#include "base/refusal.hpp"

#include <algorithm>
#include <bit>
#include <charconv>
#include <sstream>

namespace millpond {
namespace {

// Strings end with one to four zeros, so that everything begins at a multiple of four bytes.
void put_string(std::vector<std::uint8_t>& bytes, std::string_view text) {
    bytes.insert(bytes.end(), text.begin(), text.end());
    bytes.resize((bytes.size() / 4 + 1) * 4, 0);
}

void put_word(std::vector<std::uint8_t>& bytes, std::uint32_t word) {
    for (const int shift : {24, 16, 8, 0}) {
        bytes.push_back(static_cast<std::uint8_t>(word >> shift));
    }
}

/// Takes one thing after another off the front of a packet.
class Cursor {
  public:
    explicit Cursor(std::span<const std::uint8_t> rest) noexcept : rest_(rest) {}

    [[nodiscard]] bool take_string(std::string_view& text) noexcept {
        const auto end = std::find(rest_.begin(), rest_.end(), std::uint8_t{0});
        const auto length = static_cast<std::size_t>(end - rest_.begin());
        const std::size_t padded = (length / 4 + 1) * 4;
        if (end == rest_.end() || padded > rest_.size()) {
            return false;
        }
        text = {reinterpret_cast<const char*>(rest_.data()), length};
        rest_ = rest_.subspan(padded);
        return true;
    }

    [[nodiscard]] bool take_word(std::uint32_t& word) noexcept {
        if (rest_.size() < 4) {
            return false;
        }
        word = static_cast<std::uint32_t>(rest_[0]) << 24 | static_cast<std::uint32_t>(rest_[1]) << 16 |
               static_cast<std::uint32_t>(rest_[2]) << 8 | static_cast<std::uint32_t>(rest_[3]);
        rest_ = rest_.subspan(4);
        return true;
    }

  private:
    std::span<const std::uint8_t> rest_;
};

OscTrouble take_value(Cursor& cursor, OscMessage::Value& value) noexcept {
    std::uint32_t word = 0;
    switch (value.type) {
    case 's':
        return cursor.take_string(value.text) ? OscTrouble::none : OscTrouble::cut_short;
    case 'T':
    case 'F':
        value.whole = value.type == 'T' ? 1 : 0;
        break;
    case 'i':
    case 'f':
        if (!cursor.take_word(word)) {
            return OscTrouble::cut_short;
        }
        value.whole = std::bit_cast<std::int32_t>(word);
        value.number = value.type == 'f' ? std::bit_cast<float>(word) : static_cast<float>(value.whole);
        break;
    default:
        return OscTrouble::unknown_type;
    }
    return OscTrouble::none;
}

bool is_whole(const std::string& word, std::int32_t& value) {
    const auto read = std::from_chars(word.data(), word.data() + word.size(), value);
    return read.ec == std::errc{} && read.ptr == word.data() + word.size();
}

bool is_number(const std::string& word, float& value) {
    const auto read = std::from_chars(word.data(), word.data() + word.size(), value);
    return read.ec == std::errc{} && read.ptr == word.data() + word.size();
}

} // namespace

std::vector<std::uint8_t> encode_osc(const std::string& address, const std::vector<OscArgument>& arguments,
                                     const std::string& where) {
    const auto printable = [](char c) { return c > ' ' && c < 127; };
    if (address.size() < 2 || address[0] != '/' || address.find_first_of("#*,?[]{}") != std::string::npos ||
        !std::all_of(address.begin(), address.end(), printable)) {
        throw Refusal(where, "'" + address + "'", "/ and a name without spaces or # * , ? [ ] { }");
    }
    std::string tags = ",";
    for (const auto& argument : arguments) {
        tags += "ifs"[argument.index()];
    }
    std::vector<std::uint8_t> bytes;
    put_string(bytes, address);
    put_string(bytes, tags);
    for (const auto& argument : arguments) {
        if (const auto* whole = std::get_if<std::int32_t>(&argument)) {
            put_word(bytes, std::bit_cast<std::uint32_t>(*whole));
        } else if (const auto* number = std::get_if<float>(&argument)) {
            put_word(bytes, std::bit_cast<std::uint32_t>(*number));
        } else {
            put_string(bytes, std::get<std::string>(argument));
        }
    }
    return bytes;
}

std::vector<OscArgument> osc_arguments(const std::string& words) {
    std::vector<OscArgument> arguments;
    std::istringstream in(words);
    for (std::string word; in >> word;) {
        std::int32_t whole = 0;
        float number = 0.0F;
        if (is_whole(word, whole)) {
            arguments.emplace_back(whole);
        } else if (is_number(word, number)) {
            arguments.emplace_back(number);
        } else {
            arguments.emplace_back(word);
        }
    }
    return arguments;
}

std::string_view name_of(OscTrouble trouble) noexcept {
    static constexpr std::array<std::string_view, 6> names{
        "no trouble",   "not an OSC message",       "cut short",
        "no type tags", "an unknown argument type", "too many arguments"};
    return names[static_cast<std::size_t>(trouble)];
}

OscTrouble decode_osc(std::span<const std::uint8_t> packet, OscMessage& message) noexcept {
    message.count = 0;
    if (packet.empty() || packet[0] != '/') {
        return OscTrouble::not_a_message;
    }
    Cursor cursor(packet);
    std::string_view tags;
    if (!cursor.take_string(message.address)) {
        return OscTrouble::cut_short;
    }
    if (!cursor.take_string(tags) || tags.empty() || tags[0] != ',') {
        return OscTrouble::no_type_tags;
    }
    for (const char type : tags.substr(1)) {
        if (message.count == message.values.size()) {
            return OscTrouble::too_many;
        }
        auto& value = message.values[message.count];
        value = {};
        value.type = type;
        if (const auto trouble = take_value(cursor, value); trouble != OscTrouble::none) {
            return trouble;
        }
        ++message.count;
    }
    return OscTrouble::none;
}

} // namespace millpond
