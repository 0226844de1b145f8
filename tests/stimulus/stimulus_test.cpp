#include "base/refusal.hpp"
#include "stimulus/stimulus.hpp"

#include <gtest/gtest.h>

#include <algorithm>

namespace millpond {
namespace {

StimulusSettings commissural() {
    StimulusSettings settings;
    settings.current_ua = 250.0;
    settings.phase_us = 200.0;
    settings.diameter_um = 60.0;
    return settings;
}

bool says(const std::vector<std::string>& lines, const std::string& words) {
    return std::any_of(lines.begin(), lines.end(),
                       [&](const auto& line) { return line.find(words) != std::string::npos; });
}

// 250 uA x 200 us on the flat end of a 60 um wire: 0.05 uC, pi 30^2 um2 = 2827 um2, 1768 uC/cm2 and, by Shannon's
// formula (1992, IEEE Trans Biomed Eng 39:424), k = log10 (1768 * 0.05) = 1.95: arithmetic on the highest current of
// Deceuninck & Kloosterman 2024 (eLife 13:e84004).
TEST(Stimulus, ReckonsAPublishedCommissuralPulse) {
    const auto figures = stimulus_figures(commissural());
    ASSERT_TRUE(figures);
    EXPECT_DOUBLE_EQ(figures->charge_uc, 0.05);
    EXPECT_NEAR(figures->area_um2, 2827.4, 0.1);
    EXPECT_NEAR(figures->density_uc_cm2, 1768.4, 0.1);
    EXPECT_NEAR(figures->shannon_k, 1.9466, 0.0005);
    EXPECT_EQ(told(*figures), "0.05 uC a phase (biphasic), 1768 uC/cm2 on 2827 um2, Shannon k 1.95");
}

TEST(Stimulus, WarnsOfItSaysWhatTheWarningIsWorthAndWhoPermits) {
    const auto warnings = stimulus_warnings(*stimulus_figures(commissural()));
    EXPECT_TRUE(says(warnings, "59 times the rule of thumb"));
    EXPECT_TRUE(says(warnings, "not below 1.85"));
    EXPECT_TRUE(says(warnings, "does not hold for electrodes as small"));
    EXPECT_TRUE(says(warnings, "approved protocol"));
    EXPECT_TRUE(says(warnings, "veterinarian"));
}

TEST(Stimulus, ALowFigureIsNeverCalledSafe) {
    auto settings = commissural();
    settings.current_ua = 1.0;
    const auto warnings = stimulus_warnings(*stimulus_figures(settings));
    EXPECT_FALSE(says(warnings, "not below 1.85"));
    EXPECT_TRUE(says(warnings, "no sign of safety"));
    EXPECT_TRUE(says(warnings, "nothing here permits"));
}

TEST(Stimulus, MonophasicPulsesAreWarnedOf) {
    auto settings = commissural();
    settings.phases = 1;
    EXPECT_TRUE(says(stimulus_warnings(*stimulus_figures(settings)), "monophasic"));
}

TEST(Stimulus, AreaFollowsFromDiameterAndShapeUnlessItIsGiven) {
    auto settings = commissural();
    const double disc = stimulus_figures(settings)->area_um2;
    settings.shape = ElectrodeShape::hemisphere;
    EXPECT_DOUBLE_EQ(stimulus_figures(settings)->area_um2, 2.0 * disc); // 2 pi r^2 against pi r^2
    settings.shape = ElectrodeShape::cylinder;
    settings.length_um = 15.0; // its mantle, pi d 15, is as large as the disc, pi d^2 / 4, where d = 60
    EXPECT_NEAR(stimulus_figures(settings)->area_um2, 2.0 * disc, 1e-9);
    settings.area_um2 = 500.0;
    EXPECT_DOUBLE_EQ(stimulus_figures(settings)->area_um2, 500.0);
}

TEST(Stimulus, NothingDescribedGivesNothingAndACurrentNeedsAnElectrode) {
    EXPECT_FALSE(stimulus_figures({}));
    StimulusSettings settings;
    settings.current_ua = 100.0;
    EXPECT_THROW((void)stimulus_figures(settings), Refusal);
}

} // namespace
} // namespace millpond
