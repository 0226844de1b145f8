// A folder of its own for one test, gone afterwards, and other programs run in it.
#pragma once

#include <gtest/gtest.h>

#include <array>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <stdexcept>
#include <string>

namespace millpond::testing {

class ScratchFolder {
  public:
    ScratchFolder() {
        std::string pattern = (std::filesystem::temp_directory_path() / "millpond-test-XXXXXX").string();
        if (mkdtemp(pattern.data()) == nullptr) {
            throw std::runtime_error("no scratch folder");
        }
        folder_ = pattern;
    }
    ~ScratchFolder() {
        std::error_code ignored;
        std::filesystem::remove_all(folder_, ignored);
    }
    ScratchFolder(const ScratchFolder&) = delete;
    ScratchFolder& operator=(const ScratchFolder&) = delete;

    [[nodiscard]] std::filesystem::path operator/(const std::string& name) const { return folder_ / name; }

    [[nodiscard]] std::filesystem::path file(const std::string& name, const std::string& content) const {
        std::ofstream(folder_ / name, std::ios::binary) << content;
        return folder_ / name;
    }

  private:
    std::filesystem::path folder_;
};

struct Ran {
    int status;
    std::string output;
};

/// Runs a shell command; its standard output, and standard error where the command sends it there.
inline Ran run(const std::string& command) {
    std::FILE* pipe = popen(command.c_str(), "r");
    if (pipe == nullptr) {
        throw std::runtime_error("cannot run " + command);
    }
    Ran ran{};
    std::array<char, 65536> buffer;
    for (std::size_t got = 0; (got = std::fread(buffer.data(), 1, buffer.size(), pipe)) > 0;) {
        ran.output.append(buffer.data(), got);
    }
    const int status = pclose(pipe);
    ran.status = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
    return ran;
}

/// A Python that has SciPy: the first one on the path, or Debian's own. Looked for without loading SciPy, which is
/// slow.
inline const std::string& python_with_scipy() {
    static const std::string found = [] {
        for (const std::string python : {"python3", "/usr/bin/python3"}) {
            const auto look =
                " -c 'import importlib.util as u, sys; sys.exit(u.find_spec(\"scipy\") is None)' 2>/dev/null";
            if (run(python + look).status == 0) {
                return python;
            }
        }
        return std::string{};
    }();
    return found;
}

/// The folder of outside recordings, or empty.
inline std::filesystem::path outside_recordings() {
    const char* folder = std::getenv("MILLPOND_RECORDINGS");
    return folder == nullptr ? std::filesystem::path{} : std::filesystem::path(folder);
}

/// Whether `text` has `part` in it; shows the text where it has not.
inline ::testing::AssertionResult says(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos
               ? ::testing::AssertionSuccess()
               : ::testing::AssertionFailure() << "no '" << part << "' in '" << text << "'";
}

/// The one line of the Refusal that `act` throws; empty where it throws none.
template <class Exception, class Act> std::string line_of(Act&& act) {
    try {
        act();
    } catch (const Exception& refusal) {
        return refusal.what();
    }
    return {};
}

} // namespace millpond::testing
