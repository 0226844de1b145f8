// Recordings that nobody here made, through the program.
#include "app/rig.hpp"

namespace millpond::testing {
namespace {

class OutsideRecordings : public ::testing::Test {
  protected:
    void SetUp() override {
        if (outside_recordings().empty()) {
            GTEST_SKIP() << "SKIPPED LOUDLY: MILLPOND_RECORDINGS names no folder, no outside recording was tried";
        }
    }

    /// The detector of config/live.yaml over a recording with these channels.
    nlohmann::json dry_run(const std::string& recording, const std::string& channels, const std::string& more = {}) {
        const auto live = text_in(std::filesystem::path(MILLPOND_SOURCE_DIR) / "config/live.yaml");
        const auto from = live.find("\ndetector:"), to = live.find("\narbiter:");
        const auto name = "settings" + std::to_string(++runs_);
        std::ofstream(rig_ / (name + ".yaml")) << channels << live.substr(from, to - from) << "\n";
        const auto ran = rig_.millpond("dryrun " + (outside_recordings() / recording).string() + " --settings " +
                                       rig_.path(name + ".yaml") + " --out " + rig_.path(name) + more);
        EXPECT_EQ(ran.status, 0) << ran.err;
        std::printf("%s", ran.out.c_str());
        detections_ = rows_of(rig_ / name / "events.tsv", "detection");
        return ran.status == 0 ? nlohmann::json::parse(text_in(rig_ / name / "score.json")) : nlohmann::json{};
    }

    Rig rig_;
    int runs_ = 0;
    std::vector<Row> detections_;
};

// The animal is in steady theta, no ripples were seen in it: all detections are most likely false. How many there are
// is told, not judged; 38.604 s (a step) and 46.9-47.2 s (a muscle-like burst) are artefacts.
TEST_F(OutsideRecordings, RatInThetaDetectionsPerMinuteOfTheDefaultSettingsAreTold) {
    for (const auto& [what, channels] : std::map<std::string, std::string>{
             {"reference", "channels:\n  - {name: CA1, role: ripple}\n  - {name: EC3, role: reference}\n"},
             {"both_ripple", "channels:\n  - {name: CA1, role: ripple}\n  - {name: EC3, role: ripple}\n"}}) {
        const auto score = dry_run("rat_hippocampus_60s.wav", channels);
        ASSERT_FALSE(score.empty());
        const auto detections = detections_.size();
        const auto in_artefacts = std::count_if(detections_.begin(), detections_.end(), [](Row& row) {
            const double onset = std::stod(row["onset"]);
            return (onset > 38.55 && onset < 38.75) || (onset > 46.85 && onset < 47.3);
        });
        std::printf("rat in theta, EC3 as %s: %zu detections a minute, %zd of them in the two artefacts\n",
                    what.c_str(), detections, in_artefacts);
        RecordProperty("detections_per_minute_" + what, std::to_string(detections));
        EXPECT_LT(detections, 60U) << "one a second is no detector";
    }
}

TEST_F(OutsideRecordings, EdfFilesRunAtTheirOwnRateInMicrovolts) {
    for (const std::string name : {"eeg_subsecond_start.edf", "eeg_utf8_annotations.edf"}) {
        const auto score = dry_run(name, "");
        ASSERT_FALSE(score.empty());
        for (auto& row : detections_) {
            EXPECT_GT(std::stod(row["envelope_uv"]), std::stod(row["floor_uv"]));
        }
    }
}

} // namespace
} // namespace millpond::testing
