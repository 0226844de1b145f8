// Small sessions for the tests of journal and audit.
#pragma once

#include "journal/session_writer.hpp"
#include "support/files.hpp"

#include <filesystem>
#include <fstream>

namespace millpond::test {

inline void flip_bit(const std::filesystem::path& file, std::uint64_t byte) {
    std::fstream io(file, std::ios::binary | std::ios::in | std::ios::out);
    io.seekg(static_cast<std::streamoff>(byte));
    const auto old = io.get();
    io.seekp(static_cast<std::streamoff>(byte));
    io.put(static_cast<char>(old ^ 0x10));
}

inline SessionSettings session_in(const TemporaryFolder& folder, StoreSamples samples = StoreSamples::none) {
    SessionSettings settings;
    settings.folder = folder.path();
    settings.name = "test";
    settings.store_samples = samples;
    settings.min_free_mb = 1.0;
    return settings;
}

inline SessionAbout about_stream(std::size_t channels = 2, double rate_hz = 1250.0) {
    SessionAbout about;
    about.program = "millpond in a test";
    about.rate = Hertz{rate_hz};
    about.channels = ripple_channels(channels);
    about.settings_text = "{}\n";
    return about;
}

/// A note that carries a number.
inline Event numbered_note(std::uint64_t number) {
    NoteDetail detail{};
    detail.length = 8;
    __builtin_memcpy(detail.text.data(), &number, sizeof number);
    return Event::make(EventKind::note, 0, SampleIndex{number}, detail);
}

inline std::uint64_t number_in(const Event& note) {
    const auto detail = note.as<NoteDetail>();
    std::uint64_t number = 0;
    __builtin_memcpy(&number, detail.text.data(), sizeof number);
    return number;
}

} // namespace millpond::test
