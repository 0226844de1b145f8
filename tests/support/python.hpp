// Asks Python with NumPy and SciPy, which nobody here wrote, for the right answer. Debian's own interpreter is used
// (packages python3-scipy, python3-numpy): another one earlier on the path may lack them. Thread: test.
#pragma once

#include "support/process.hpp"

#include <gtest/gtest.h>

#include <span>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

namespace millpond::test {

/// What `program` prints, with `arguments` as sys.argv[1:]; throws where it fails.
inline std::string python(const std::string& program, const std::string& arguments = {}) {
    const TemporaryFolder folder;
    const auto ran = run("/usr/bin/python3 " + folder.file("ask.py", program).string() + " " + arguments);
    if (ran.status != 0) {
        throw std::runtime_error("Python failed: " + ran.err);
    }
    return ran.out;
}

/// Looked for without loading SciPy, which is slow.
inline bool scipy_is_there() {
    static const bool there =
        run("/usr/bin/python3 -c 'import importlib.util as u, sys; sys.exit(u.find_spec(\"scipy\") is None)'").status ==
        0;
    return there;
}

/// Runs `script` with numpy as np, scipy.signal as signal, scipy.stats as stats and scipy.ndimage as ndimage imported,
/// `values` as x, in rows of `columns` where given, and `arguments` as sys.argv[2:]; what it prints is read as numbers.
template <class Value>
std::vector<double> ask_scipy(const std::string& script, const std::vector<Value>& values, std::size_t columns = 0,
                              const std::string& arguments = {}) {
    const TemporaryFolder folder;
    const auto bytes = std::as_bytes(std::span(values));
    const auto data = folder.file("x.bin", {reinterpret_cast<const char*>(bytes.data()), bytes.size()});
    const auto rows = columns == 0 ? std::string{} : ".reshape(-1, " + std::to_string(columns) + ")";
    std::istringstream words(python("import sys\nimport numpy as np\nfrom scipy import signal, stats, ndimage\n"
                                    "np.set_printoptions(threshold=10**9)\n"
                                    "def tell(v):\n    print(*[repr(float(i)) for i in np.atleast_1d(v)])\n"
                                    "x = np.fromfile(sys.argv[1], '<f" +
                                        std::to_string(sizeof(Value)) + "').astype(float)" + rows + "\n" + script +
                                        "\n",
                                    data.string() + " " + arguments));
    std::vector<double> answer;
    for (std::string word; words >> word;) {
        answer.push_back(std::stod(word));
    }
    return answer;
}
inline std::vector<double> ask_scipy(const std::string& script) {
    return ask_scipy(script, std::vector<double>{});
}

} // namespace millpond::test

#define MILLPOND_NEEDS_SCIPY()                                                                                         \
    if (!millpond::test::scipy_is_there()) {                                                                           \
        GTEST_SKIP()                                                                                                   \
            << "SKIPPED LOUDLY: /usr/bin/python3 has no SciPy (Debian: python3-scipy), not checked against it";        \
    }                                                                                                                  \
    static_cast<void>(0)
