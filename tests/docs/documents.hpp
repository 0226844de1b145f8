// Reads the project's own texts for the tests that hold them to the code.
#pragma once

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <regex>
#include <set>
#include <stdexcept>
#include <string>
#include <vector>

namespace millpond::testing {

inline const std::filesystem::path source_folder = MILLPOND_SOURCE_DIR;

inline std::string text_of(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    if (!in) {
        throw std::runtime_error("cannot read " + file.string());
    }
    return {std::istreambuf_iterator<char>(in), {}};
}

/// What lies between `begin` and `end`, without them; empty where one is absent.
inline std::string between(const std::string& text, const std::string& begin, const std::string& end) {
    const auto from = text.find(begin);
    const auto to = from == std::string::npos ? from : text.find(end, from + begin.size());
    return to == std::string::npos ? std::string{} : text.substr(from + begin.size(), to - from - begin.size());
}

/// Group `group` of every match, each once.
inline std::set<std::string> all_matches(const std::string& text, const std::string& pattern, std::size_t group = 0) {
    const std::regex expression(pattern);
    std::set<std::string> found;
    for (std::sregex_iterator match(text.begin(), text.end(), expression), none; match != none; ++match) {
        found.insert((*match)[group].str());
    }
    return found;
}

inline std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    for (std::size_t at = 0; at < text.size();) {
        const auto end = std::min(text.find('\n', at), text.size());
        lines.push_back(text.substr(at, end - at));
        at = end + 1;
    }
    return lines;
}

inline bool has(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

} // namespace millpond::testing
