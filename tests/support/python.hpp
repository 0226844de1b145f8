// Asks Python (NumPy, SciPy) for a reference value. Thread: test.
#pragma once

#include <cstdio>
#include <filesystem>
#include <fstream>
#include <stdexcept>
#include <string>

#include <unistd.h>

namespace millpond::test {

/// What `command` prints; throws where it fails.
inline std::string output_of(const std::string& command) {
    FILE* pipe = popen(command.c_str(), "r");
    if (pipe == nullptr) {
        throw std::runtime_error("cannot run " + command);
    }
    std::string text;
    char chunk[4096];
    for (std::size_t got = 0; (got = fread(chunk, 1, sizeof chunk, pipe)) > 0;) {
        text.append(chunk, got);
    }
    if (pclose(pipe) != 0) {
        throw std::runtime_error("failed: " + command);
    }
    return text;
}

/// What `program` prints when Debian's own Python runs it.
inline std::string python(const std::string& program) {
    const auto file = std::filesystem::temp_directory_path() / ("millpond_reference_" + std::to_string(getpid()) + ".py");
    std::ofstream(file) << program;
    auto text = output_of("/usr/bin/python3 " + file.string());
    std::filesystem::remove(file);
    return text;
}

} // namespace millpond::test
