// Asks SciPy, which nobody here wrote, for the right answer. Debian's own interpreter is used (packages python3-scipy,
// python3-numpy): another one earlier on the path may lack them.
#pragma once

#include <gtest/gtest.h>

#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <memory>
#include <sstream>
#include <string>
#include <unistd.h>
#include <vector>

namespace millpond::test {

/// A folder of its own under the system's temporary one, gone with the object.
class TemporaryFolder {
  public:
    TemporaryFolder() {
        std::string pattern = (std::filesystem::temp_directory_path() / "millpond-XXXXXX").string();
        path_ = mkdtemp(pattern.data());
    }
    TemporaryFolder(const TemporaryFolder&) = delete;
    TemporaryFolder& operator=(const TemporaryFolder&) = delete;
    ~TemporaryFolder() { std::filesystem::remove_all(path_); }

    [[nodiscard]] const std::filesystem::path& path() const noexcept { return path_; }
    std::filesystem::path operator/(const std::string& name) const { return path_ / name; }

  private:
    std::filesystem::path path_;
};

inline bool scipy_is_there() {
    static const bool there = std::system("/usr/bin/python3 -c 'import scipy, numpy' 2>/dev/null") == 0;
    return there;
}

/// Runs `script` with numpy as np, scipy.signal as signal, scipy.stats as stats and scipy.ndimage as ndimage imported
/// and `values` (doubles) as x; what it prints is read as numbers.
inline std::vector<double> ask_scipy(const std::string& script, const std::vector<double>& values = {}) {
    const TemporaryFolder folder;
    std::ofstream(folder / "x.bin", std::ios::binary)
        .write(reinterpret_cast<const char*>(values.data()),
               static_cast<std::streamsize>(values.size() * sizeof(double)));
    std::ofstream(folder / "ask.py") << "import numpy as np\nfrom scipy import signal, stats, ndimage\n"
                                     << "np.set_printoptions(threshold=10**9)\n"
                                     << "def tell(v):\n    print(*[repr(float(i)) for i in np.atleast_1d(v)])\n"
                                     << "x = np.fromfile('" << (folder / "x.bin").string() << "')\n"
                                     << script << "\n";
    const std::string command = "/usr/bin/python3 " + (folder / "ask.py").string();
    const std::unique_ptr<FILE, int (*)(FILE*)> pipe(popen(command.c_str(), "r"), pclose);
    std::string text;
    char part[4096];
    for (std::size_t n = 0; (n = std::fread(part, 1, sizeof part, pipe.get())) > 0;) {
        text.append(part, n);
    }
    std::vector<double> answer;
    std::istringstream words(text);
    for (std::string word; words >> word;) {
        answer.push_back(std::stod(word));
    }
    return answer;
}

} // namespace millpond::test

#define MILLPOND_NEEDS_SCIPY()                                                                                         \
    if (!millpond::test::scipy_is_there()) {                                                                           \
        GTEST_SKIP()                                                                                                   \
            << "SKIPPED LOUDLY: /usr/bin/python3 has no SciPy (Debian: python3-scipy), not checked against it";        \
    }                                                                                                                  \
    static_cast<void>(0)
