#include "support/python.hpp"
#include "synth/bare_scene.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace millpond {
namespace {

// numpy.corrcoef: 0.9 exp(-distance / 500 um) between sites 100 um apart and a reference 800 um above the first.
TEST(Background, CorrelationFallsWithDistance) {
    MILLPOND_NEEDS_SCIPY();
    auto settings = test::silent(5, true);
    settings.duration_s = 600.0;
    settings.site_spacing_um = 100.0;
    settings.reference_um = 800.0;
    settings.background = {100.0, 1.0, 5.0, 0.9, 500.0, 0.0};
    const auto said =
        test::ask_scipy("print(*np.corrcoef(x.T).ravel(), *x.std(0))", test::live_through(settings).frames, 6);
    ASSERT_EQ(said.size(), 42u);
    const auto depth_um = [](std::size_t i) { return i == 5 ? -800.0 : 100.0 * static_cast<double>(i); };
    for (std::size_t i = 0; i < 6; ++i) {
        EXPECT_NEAR(said[36 + i], 100.0, 4.0) << "no channel is larger than another";
        for (std::size_t j = 0; j < i; ++j) {
            EXPECT_NEAR(said[6 * i + j], 0.9 * std::exp(-std::abs(depth_um(i) - depth_um(j)) / 500.0), 0.05) << i << j;
        }
    }
}

} // namespace
} // namespace millpond
