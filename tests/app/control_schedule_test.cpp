// A control session made from an ordinary one: its pulses become a schedule, and the same settings play it.
#include "app/rig.hpp"
#include "settings/settings.hpp"

namespace millpond::test {
namespace {

class ControlSchedule : public ::testing::Test {
  protected:
    /// A session over the whole recording; its folder.
    std::filesystem::path play(const std::vector<std::string>& more = {}) {
        std::vector<std::string> words{MILLPOND_PROGRAM, "live", settings_};
        words.insert(words.end(), more.begin(), more.end());
        return rig_.play(std::move(words), recording_, frames).folder;
    }
    static std::vector<std::string> samples_of(const std::filesystem::path& table, const std::string& trial_type) {
        std::vector<std::string> samples;
        for (auto& row : rows_of(table, trial_type)) {
            samples.push_back(row["sample"]);
        }
        return samples;
    }

    static constexpr std::uint64_t frames = 15000; // 12 s
    Rig rig_;
    std::string recording_ = rig_.recording(12.0);
    std::string settings_ = rig_.settings({});
};

TEST_F(ControlSchedule, YokedToASessionFolderPlaysItsPulsesWithoutEditingTheSettings) {
    const auto disrupted = play();
    const auto yoked = "sham yoked " + disrupted.string() + " --out " + rig_.path("control.tsv");
    const auto refused = run_millpond(yoked + " --sampling-hz 1000");
    EXPECT_EQ(refused.status, 2);
    EXPECT_NE(refused.err.find("--sampling-hz: found 1000; allowed: the rate of "), std::string::npos) << refused.err;
    const auto made = run_millpond(yoked);
    ASSERT_EQ(made.status, 0) << made.err;
    EXPECT_NE(made.out.find("orders: the pulses that were given"), std::string::npos) << made.out;
    EXPECT_NE(made.out.find("within the lock-out (500 ms)"), std::string::npos) << "the session's own:\n" << made.out;
    auto places = samples_of(rig_ / "control.tsv", "scheduled");
    EXPECT_EQ(places, samples_of(disrupted / "events.tsv", "order"));

    const auto control = play({"--condition", "yoked", "--schedule", rig_.path("control.tsv")});
    ASSERT_GT(places.size(), 2U);
    EXPECT_EQ(load_settings(control / "settings.yaml").arbiter.condition, Condition::yoked);
    const auto audited = rig_.audit(control)["controls"]["scheduled"];
    EXPECT_EQ(audited["planned"], places.size());
    EXPECT_EQ(audited["given"], samples_of(control / "events.tsv", "order").size());
    EXPECT_GT(audited["given"], 0);
    EXPECT_EQ(audited["given"].get<std::size_t>() + audited["omitted"].get<std::size_t>() +
                  audited["not_reached"].get<std::size_t>(),
              places.size());
}

TEST_F(ControlSchedule, AlignedWithTheArmingOfItsSourceLeavesOutWhatCameBefore) {
    const auto disrupted = play();
    const auto made =
        run_millpond("sham yoked " + disrupted.string() + " --align armed --out " + rig_.path("control.tsv"));
    ASSERT_EQ(made.status, 0) << made.err;
    EXPECT_NE(made.out.find("armed (0.000 s of it)"), std::string::npos) << made.out;
}

TEST_F(ControlSchedule, OfATableNeedsItsRate) {
    run("printf 'onset\\tduration\\ttrial_type\\n1\\t0\\ttrigger\\n' >" + rig_.path("e.tsv"));
    const auto made = run_millpond("sham yoked " + rig_.path("e.tsv") + " --out " + rig_.path("c.tsv"));
    EXPECT_EQ(made.status, 2);
    EXPECT_NE(made.err.find("--sampling-hz: found nothing"), std::string::npos) << made.err;
}

} // namespace
} // namespace millpond::test
