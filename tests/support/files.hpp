// A folder for one test, gone afterwards, and what files hold. Thread: test.
#pragma once

#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <stdexcept>
#include <string>

namespace millpond::test {

/// The whole file; throws where it cannot be read.
inline std::string text_of(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    if (!in) {
        throw std::runtime_error("cannot read " + file.string());
    }
    return {std::istreambuf_iterator<char>(in), {}};
}

inline void write_text(const std::filesystem::path& file, const std::string& text) {
    std::ofstream(file, std::ios::binary) << text;
}

/// A folder of its own under the system's temporary one, gone with the object.
class TemporaryFolder {
  public:
    TemporaryFolder() {
        std::string pattern = (std::filesystem::temp_directory_path() / "millpond-test-XXXXXX").string();
        if (mkdtemp(pattern.data()) == nullptr) {
            throw std::runtime_error("no temporary folder");
        }
        path_ = pattern;
    }
    ~TemporaryFolder() {
        std::error_code ignored;
        std::filesystem::remove_all(path_, ignored);
    }
    TemporaryFolder(const TemporaryFolder&) = delete;
    TemporaryFolder& operator=(const TemporaryFolder&) = delete;

    [[nodiscard]] const std::filesystem::path& path() const noexcept { return path_; }
    [[nodiscard]] std::filesystem::path operator/(const std::string& name) const { return path_ / name; }

    /// Writes a file into it.
    [[nodiscard]] std::filesystem::path file(const std::string& name, const std::string& content) const {
        write_text(path_ / name, content);
        return path_ / name;
    }

  private:
    std::filesystem::path path_;
};

/// The folder of outside recordings, or empty.
inline std::filesystem::path outside_recordings() {
    const char* folder = std::getenv("MILLPOND_RECORDINGS");
    return folder == nullptr ? std::filesystem::path{} : std::filesystem::path(folder);
}

} // namespace millpond::test
