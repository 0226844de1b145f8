// Recordings that nobody here made, through the program.
#include "app/rig.hpp"

namespace millpond::test {
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
        const auto live = text_of(std::filesystem::path(MILLPOND_SOURCE_DIR) / "config/live.yaml");
        const auto from = live.find("\ndetector:"), to = live.find("\narbiter:");
        const auto name = "settings" + std::to_string(++runs_);
        std::ofstream(rig_ / (name + ".yaml")) << channels << live.substr(from, to - from) << "\n";
        const auto ran = run_millpond("dryrun " + (outside_recordings() / recording).string() + " --settings " +
                                      rig_.path(name + ".yaml") + " --out " + rig_.path(name) + more);
        EXPECT_EQ(ran.status, 0) << ran.err;
        std::printf("%s", ran.out.c_str());
        detections_ = rows_of(rig_ / name / "events.tsv", "detection");
        return ran.status == 0 ? nlohmann::json::parse(text_of(rig_ / name / "score.json")) : nlohmann::json{};
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
        EXPECT_LT(detections, 180U) << "three a second: the floor was not held";
        if (what == "reference") {
            EXPECT_LE(detections, 1U) << "evidence of one site tells spikes and artefacts from ripples";
            EXPECT_EQ(in_artefacts, 0);
        }
    }
}

// EEG at 128 Hz cannot hold ripples: said, not tried.
TEST_F(OutsideRecordings, EdfFilesAtARateBelowTheRippleBandAreRefusedInOneLine) {
    std::ofstream(rig_ / "plain.yaml") << "detector: {}\n";
    for (const std::string name : {"eeg_subsecond_start.edf", "eeg_utf8_annotations.edf"}) {
        const auto ran = run_millpond("dryrun " + (outside_recordings() / name).string() + " --settings " +
                                      rig_.path("plain.yaml") + " --out " + rig_.path("refused"));
        EXPECT_EQ(ran.status, 2);
        EXPECT_EQ(lines_of(ran.err).size(), 1U) << ran.err;
        EXPECT_NE(ran.err.find("0.45 of the rate, 57.6 Hz"), std::string::npos) << ran.err;
        EXPECT_FALSE(std::filesystem::exists(rig_ / "refused"));
    }
}

// The same files with a band that their rate can hold (sigma, 11-16 Hz). Both hold the same signal, one of them with
// its physical range turned over: sizes must come out the same, and as microvolts of an EEG.
TEST_F(OutsideRecordings, EdfFilesRunAtTheirOwnRateInMicrovolts) {
    std::ofstream(rig_ / "eeg.yaml")
        << "detector:\n  method: envelope\n  filter: {low_hz: 11, high_hz: 16}\n  envelope: {smoothing_ms: 50}\n"
           "  floor: {time_constant_s: 5, settle_s: 2}\n";
    std::ofstream(rig_ / "referee.yaml") << "low_hz: 11\nhigh_hz: 16\nsmoothing_ms: 50\n";
    std::vector<std::vector<Row>> detections;
    for (const std::string name : {"eeg_subsecond_start.edf", "eeg_utf8_annotations.edf"}) {
        const auto ran =
            run_millpond("dryrun " + (outside_recordings() / name).string() + " --settings " + rig_.path("eeg.yaml") +
                         " --referee " + rig_.path("referee.yaml") + " --out " + rig_.path(name));
        ASSERT_EQ(ran.status, 0) << ran.err;
        EXPECT_NE(ran.out.find("channels at 128 Hz"), std::string::npos) << ran.out;
        detections.push_back(rows_of(rig_ / name / "events.tsv", "detection"));
    }
    ASSERT_GE(detections[0].size(), 5U);
    EXPECT_EQ(detections[0], detections[1]);
    for (auto& row : detections[0]) {
        const double envelope = std::stod(row["envelope_uv"]);
        EXPECT_GT(envelope, std::stod(row["threshold_uv"]) - 1e-3);
        EXPECT_GT(envelope, 1.0) << "volts would be a millionth of it";
        EXPECT_LT(envelope, 1000.0);
    }
}

} // namespace
} // namespace millpond::test
