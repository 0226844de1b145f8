#include "outputs/serial_bytes_output.hpp"

#include "base/refusal.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <poll.h>
#include <string_view>
#include <unistd.h>

namespace millpond {
namespace {

constexpr std::string_view greeting = "millpond line 1 ";
constexpr Nanos ask_every = std::chrono::milliseconds{250};
constexpr Nanos answer_within = std::chrono::seconds{1};
constexpr Nanos identify_within = std::chrono::seconds{4};
constexpr Nanos open_again_every = std::chrono::seconds{5};
constexpr Nanos identify_again_within = std::chrono::milliseconds{50};

} // namespace

SerialBytesOutput::SerialBytesOutput(const OutputSettings& settings)
    : port_(settings.device, settings.where("device"), settings.baud) {
    set_line(false);
    if (!identify(identify_within)) {
        throw Refusal(settings.where("device"), settings.device + " (nobody answers '?')",
                      "a microcontroller that runs tools/pulse_line, at this baud rate");
    }
    if (longest_high_ms_ <= settings.width_ms) {
        throw Refusal(settings.where("width_ms"), std::to_string(settings.width_ms),
                      "less than the board's own longest high time, " + std::to_string(longest_high_ms_) + " ms");
    }
}

bool SerialBytesOutput::send(char byte) const noexcept {
    return ::write(port_.file().descriptor(), &byte, 1) == 1;
}

bool SerialBytesOutput::identify(Nanos patience) noexcept {
    std::array<char, 256> heard{};
    std::size_t length = 0;
    const auto end = monotonic_now() + patience;
    for (Nanos asked{}; monotonic_now() < end;) {
        if (monotonic_now() - asked >= ask_every) {
            asked = monotonic_now();
            send('?');
        }
        pollfd port{port_.file().descriptor(), POLLIN, 0};
        ::poll(&port, 1, 10);
        if (length == heard.size()) {
            length = 0; // noise of a board that starts
        }
        length += take_bytes(heard.data() + length, heard.size() - length);
        if (is_identity(heard.data(), length)) {
            answered_at_ = monotonic_now();
            return set_line(false);
        }
    }
    return false;
}

bool SerialBytesOutput::is_identity(const char* text, std::size_t length) noexcept {
    const std::string_view heard(text, length);
    const auto at = heard.rfind(greeting);
    if (at == std::string_view::npos) {
        return false;
    }
    const auto number = heard.substr(at + greeting.size());
    std::uint32_t longest = 0;
    const auto read = std::from_chars(number.begin(), number.end(), longest);
    if (read.ec != std::errc{} || read.ptr == number.end()) {
        return false; // the line has not ended yet
    }
    longest_high_ms_ = longest;
    return true;
}

std::size_t SerialBytesOutput::take_bytes(char* to, std::size_t room) const noexcept {
    const auto got = ::read(port_.file().descriptor(), to, room);
    return got > 0 ? static_cast<std::size_t>(got) : 0;
}

bool SerialBytesOutput::answers() noexcept {
    const auto now = monotonic_now();
    bool there = true;
    if (now - asked_at_ >= ask_every) {
        if (now - asked_at_ > answer_within) {
            answered_at_ = now; // this program stood still, the board may not be blamed
        }
        asked_at_ = now;
        there = send('K');
    }
    std::array<char, 64> heard{};
    const auto length = take_bytes(heard.data(), heard.size());
    if (std::find(heard.begin(), heard.begin() + static_cast<std::ptrdiff_t>(length), 'k') !=
        heard.begin() + static_cast<std::ptrdiff_t>(length)) {
        answered_at_ = now;
    }
    return there && now - answered_at_ < answer_within && port_.exists();
}

bool SerialBytesOutput::reopen() noexcept {
    // A board that restarts when its port is opened is given the time for that.
    if (monotonic_now() - reopened_at_ > open_again_every || !port_.exists() || !send('?')) {
        reopened_at_ = monotonic_now();
        if (!port_.reopen()) {
            return false;
        }
    }
    return identify(identify_again_within);
}

} // namespace millpond
