// Samples handed to SciPy, numbers handed back.
#pragma once

#include "support/scratch_folder.hpp"
#include "synth/scene.hpp"

#include <sstream>
#include <string>
#include <vector>

namespace millpond::testing {

inline std::vector<float> all_frames(Scene scene) {
    std::vector<float> frames(scene.frames() * scene.channels().size());
    scene.next(frames);
    return frames;
}

/// Runs `script` with `x` (values x channels, float32) and `arguments` as sys.argv[2:]; the numbers it prints.
inline std::vector<double> scipy_says(const std::string& script, const std::vector<float>& values, std::size_t channels,
                                      const std::string& arguments = {}) {
    const ScratchFolder scratch;
    const auto data = scratch / "x.f32";
    std::ofstream(data, std::ios::binary)
        .write(reinterpret_cast<const char*>(values.data()),
               static_cast<std::streamsize>(values.size() * sizeof(float)));
    const auto file = scratch.file("script.py", "import sys, numpy as np, scipy.signal as ss\n"
                                                "x = np.fromfile(sys.argv[1], '<f4').astype(float).reshape(-1, " +
                                                    std::to_string(channels) + ")\n" + script);
    const auto ran = run(python_with_scipy() + " '" + file.string() + "' '" + data.string() + "' " + arguments);
    std::istringstream numbers(ran.output);
    std::vector<double> said;
    for (double number = 0.0; numbers >> number;) {
        said.push_back(number);
    }
    return said;
}

} // namespace millpond::testing
