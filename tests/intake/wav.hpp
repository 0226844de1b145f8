// A RIFF WAVE file byte by byte, by no library: what the tests of senders send.
#pragma once

#include <cstdint>
#include <string>

namespace millpond::test {

/// Appends `value`, little endian.
inline void put(std::string& out, std::uint32_t value, int bytes) {
    for (int i = 0; i < bytes; ++i) {
        out.push_back(static_cast<char>((value >> (8 * i)) & 0xff));
    }
}

/// `format_tag`: 1 integers, 3 floats; `samples` as they stand in the file.
inline std::string wav(std::uint16_t format_tag, std::uint32_t rate, std::uint32_t channels, std::uint32_t sample_bytes,
                       const std::string& samples) {
    std::string file = "RIFF";
    put(file, 36 + static_cast<std::uint32_t>(samples.size()), 4);
    file += "WAVEfmt ";
    put(file, 16, 4);
    put(file, format_tag, 2);
    put(file, channels, 2);
    put(file, rate, 4);
    put(file, rate * channels * sample_bytes, 4);
    put(file, channels * sample_bytes, 2);
    put(file, 8 * sample_bytes, 2);
    file += "data";
    put(file, static_cast<std::uint32_t>(samples.size()), 4);
    return file + samples;
}

} // namespace millpond::test
