// A control session made from an ordinary one: its triggers become a schedule, and the same settings play it.
#include "app/rig.hpp"
#include "settings/settings.hpp"

namespace millpond::test {
namespace {

class ControlSchedule : public ::testing::Test {
  protected:
    ControlSchedule() {
        const auto made = run_millpond("synth " + rig_.path("rest.raw") +
                                       " --encoding float32 --duration-s 12 --sites 4 --reference"
                                       " --rate-hz 1250 --quiet-start-s 3 --seed 7");
        EXPECT_EQ(made.status, 0) << made.err;
        RigSettings want;
        want.stream = "  source: pipe\n  encoding: float32\n  rate_hz: 1250\n  channels: 5\n";
        settings_ = rig_.settings(want);
    }

    /// A session over the whole recording; its folder.
    std::filesystem::path play(const std::string& more = {}) {
        const auto ran = run("exec " + std::string(MILLPOND_PROGRAM) + " live " + settings_ + " " + more + " <" +
                             rig_.path("rest.raw"));
        EXPECT_EQ(ran.status, 0) << ran.err;
        const auto at = ran.out.find("session: ");
        return at == std::string::npos ? "" : ran.out.substr(at + 9, ran.out.find('\n', at) - at - 9);
    }
    static std::vector<std::string> samples_of(const std::filesystem::path& table, const std::string& trial_type) {
        std::vector<std::string> samples;
        for (auto& row : rows_of(table, trial_type)) {
            samples.push_back(row["sample"]);
        }
        return samples;
    }

    Rig rig_;
    std::string settings_;
};

TEST_F(ControlSchedule, FromTheTriggersOfASessionFolderPlaysWithoutEditingTheSettings) {
    const auto disrupted = play();
    const auto made = run_millpond("sham delayed " + disrupted.string() +
                                   " --lockout-ms 500 --min-interval-ms 500 --out " + rig_.path("control.tsv"));
    ASSERT_EQ(made.status, 0) << made.err;
    const auto places = samples_of(rig_ / "control.tsv", "scheduled");
    EXPECT_EQ(places.size(), samples_of(disrupted / "events.tsv", "trigger").size());
    ASSERT_GT(places.size(), 3U);

    const auto control = play("--schedule " + rig_.path("control.tsv"));
    auto played = places;
    std::erase_if(played, [](const std::string& sample) { return std::stoul(sample) >= 15000; }); // 12 s
    EXPECT_EQ(samples_of(control / "events.tsv", "trigger"), played);
    const auto audit = rig_.audit(control);
    EXPECT_EQ(audit["decisions"]["scheduled_triggers"], played.size()) << audit["decisions"];
    EXPECT_EQ(load_settings(control / "settings.yaml").arbiter.condition, Condition::schedule);
}

TEST_F(ControlSchedule, OfAnotherRateThanTheSessionFoldersIsRefused) {
    const auto made =
        run_millpond("sham delayed " + play().string() + " --sampling-hz 1000 --out " + rig_.path("c.tsv"));
    EXPECT_EQ(made.status, 2);
    EXPECT_NE(made.err.find("--sampling-hz: found 1000; allowed: the rate of "), std::string::npos) << made.err;
}

TEST_F(ControlSchedule, OfATableNeedsItsRate) {
    run("printf 'onset\\tduration\\ttrial_type\\n1\\t0\\ttrigger\\n' >" + rig_.path("e.tsv"));
    const auto made = run_millpond("sham delayed " + rig_.path("e.tsv") + " --out " + rig_.path("c.tsv"));
    EXPECT_EQ(made.status, 2);
    EXPECT_NE(made.err.find("--sampling-hz: found nothing"), std::string::npos) << made.err;
}

} // namespace
} // namespace millpond::test
