#include "proof/second_opinion.hpp"

#include "support/bench.hpp"
#include "tests/support/textbook_json.hpp"

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>

namespace millpond::bench {
std::vector<SampleIndex> scipy_textbook(const DetectorSettings& settings, const Channels& channels, Hertz rate,
                                        std::span<const float> data) {
    auto pattern = (std::filesystem::temp_directory_path() / "millpond-proof-XXXXXX").string();
    if (mkdtemp(pattern.data()) == nullptr) {
        throw std::runtime_error("no temporary folder");
    }
    const std::filesystem::path folder = pattern;
    std::ofstream(folder / "frames.f32", std::ios::binary)
        .write(reinterpret_cast<const char*>(data.data()), static_cast<std::streamsize>(data.size_bytes()));
    std::ofstream(folder / "settings.json") << test::textbook_json(settings, channels, rate);
    std::istringstream lines(output_of("/usr/bin/python3 " MILLPOND_SOURCE_DIR "/bench/scipy_textbook.py " +
                                       (folder / "frames.f32").string() + " " + (folder / "settings.json").string()));
    std::filesystem::remove_all(folder);
    std::vector<SampleIndex> found;
    for (std::uint64_t at = 0; lines >> at;) {
        found.push_back({at});
    }
    return found;
}

std::size_t shared(const std::vector<SampleIndex>& a, const std::vector<SampleIndex>& b, std::uint64_t frames) {
    return static_cast<std::size_t>(std::count_if(a.begin(), a.end(), [&](SampleIndex at) {
        const auto near = std::lower_bound(b.begin(), b.end(), SampleIndex{at.value - std::min(at.value, frames)});
        return near != b.end() && near->value <= at.value + frames;
    }));
}

} // namespace millpond::bench
