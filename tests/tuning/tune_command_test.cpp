// The command from outside: what it writes, how it stops and goes on, how it is split.
#include "app/dry_run.hpp"
#include "settings/settings.hpp"
#include "support/files.hpp"
#include "support/invented_recording.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::InventedRecording;
using test::Process;
using test::Ran;
using test::run;
using test::run_millpond;
using test::TemporaryFolder;
using test::text_of;
using test::write_text;

// A folder with a recording, its truth and a grid of 24 settings.
struct Tune {
    TemporaryFolder folder;

    explicit Tune(double seconds = 90.0, double ripple_uv = 60.0) {
        const InventedRecording recording(seconds, 10.0, ripple_uv);
        recording.write(folder / "r.wav");
        recording.write_truth(folder / "truth.tsv");
        write_text(folder / "grid.yaml",
                   "detector:\n  method: [envelope]\n  filter: {order: [1, 2]}\n  envelope: {smoothing_ms: [4, 8]}\n"
                   "  threshold: {deviations: [3, 3.5, 4, 4.5, 5, 6]}\n");
    }
    static std::string arguments(const std::string& more) {
        return "tune r.wav --labels truth.tsv --grid grid.yaml --block-s 10 " + more;
    }
    [[nodiscard]] Ran tune(const std::string& more) const { return run_millpond(arguments(more), folder.path()); }
    [[nodiscard]] std::string text(const std::string& file) const { return text_of(folder / file); }
    [[nodiscard]] bool has(const std::string& file) const { return std::filesystem::exists(folder / file); }
};

TEST(TuneCommand, WritesSettingsThatADryRunTakesWithTheFiguresThatWerePromised) {
    const Tune bench;
    write_text(bench.folder / "base.yaml", "arbiter: {lockout_ms: 200}\n");
    const auto ran = bench.tune("--settings base.yaml --out tuned.yaml --table table.tsv --curve curve.tsv");
    ASSERT_EQ(ran.status, 0) << ran.err;
    const auto settings = load_settings(bench.folder / "tuned.yaml");
    EXPECT_EQ(settings.arbiter.lockout_ms, 200.0);
    EXPECT_EQ(settings.channels.size(), 2U);
    DryRunPlan dry;
    dry.recording = bench.folder / "r.wav";
    dry.settings = bench.folder / "tuned.yaml";
    dry.labels = bench.folder / "truth.tsv";
    const auto score = dry_run(dry).score;
    EXPECT_LE(score.false_per_minute, 1.0);
    const auto table = bench.text("table.tsv");
    EXPECT_EQ(std::count(table.begin(), table.end(), '\n'), 25); // a header and 24 settings
    EXPECT_NE(ran.out.find("picked "), std::string::npos) << ran.out;
    EXPECT_NE(ran.out.find("few minutes"), std::string::npos) << ran.out;
    EXPECT_NE(ran.out.find("\n*"), std::string::npos) << ran.out;
    EXPECT_GE(bench.text("curve.tsv").size(), 100U);
    EXPECT_FALSE(bench.has("tuned.yaml.work"));
}

// What is learned stands in the settings file, and a dry run with it gives the figures that were told.
TEST(TuneCommand, LearnsTheEvidenceIntoSettingsThatADryRunTakes) {
    const Tune bench(120.0, 45.0);
    const auto ran = run_millpond("tune r.wav --labels truth.tsv --block-s 10 --learn --max-false-per-minute 3 "
                                  "--out learned.yaml",
                                  bench.folder.path());
    ASSERT_EQ(ran.status, 0) << ran.err;
    const auto settings = load_settings(bench.folder / "learned.yaml");
    const auto& evidence = settings.detector.evidence;
    EXPECT_EQ(settings.detector.method, DetectionMethod::evidence);
    EXPECT_EQ(evidence.false_per_minute, 3.0);
    ASSERT_EQ(evidence.mixes.size(), 1U);
    EXPECT_EQ(evidence.mixes[0].weights.size(), 2U);
    EXPECT_EQ(evidence.background.size(), 3U);
    ASSERT_EQ(evidence.trained_on.size(), 1U);
    EXPECT_EQ(evidence.trained_on[0].recording, "r.wav");
    EXPECT_EQ(evidence.trained_on[0].checksum.size(), 8U);
    EXPECT_NEAR(evidence.trained_on[0].minutes, 1.0, 0.01) << "every other block";
    DryRunPlan dry;
    dry.recording = bench.folder / "r.wav";
    dry.settings = bench.folder / "learned.yaml";
    dry.labels = bench.folder / "truth.tsv";
    const auto score = dry_run(dry).score;
    EXPECT_GT(score.hit_rate.share, 0.9);
    EXPECT_NE(ran.out.find("training "), std::string::npos) << ran.out;
    EXPECT_NE(ran.out.find("held out "), std::string::npos) << ran.out;
    EXPECT_NE(ran.out.find("pattern uV"), std::string::npos) << ran.out;
}

TEST(TuneCommand, TakesOptionsBesideAGridAndRefusesAKeyThatBothHave) {
    const Tune bench(40.0);
    ASSERT_EQ(bench.tune("--low-hz 140,150 --part 1/1 --out o.yaml").status, 0);
    EXPECT_NE(bench.text("o.yaml.part-1-of-1").find("candidates\t48\n"), std::string::npos);
    const auto ran = bench.tune("--order 1,2 --out p.yaml");
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("detector.filter.order"), std::string::npos) << ran.err;
    const auto bad = bench.tune("--smoothing-ms soon --out p.yaml");
    EXPECT_EQ(bad.status, 2);
    const auto beyond = bench.tune("--low-hz 700 --high-hz 900 --out p.yaml"); // half the rate is 625 Hz
    EXPECT_EQ(beyond.status, 2);
    EXPECT_FALSE(bench.has("p.yaml.work"));
}

TEST(TuneCommand, WritesNothingWhereNoSettingsKeepTheLimitAndDoesNotSweepAgainForAnotherLimit) {
    const Tune bench(60.0);
    write_text(bench.folder / "truth.tsv", "onset\tduration\n"); // every ripple found is then false
    const auto ran = bench.tune("--max-false-per-minute 0.5 --out t.yaml");
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("max-false-per-minute"), std::string::npos) << ran.err;
    EXPECT_FALSE(bench.has("t.yaml"));
    ASSERT_TRUE(bench.has("t.yaml.work"));
    const auto before = bench.text("t.yaml.work");
    EXPECT_EQ(bench.tune("--max-false-per-minute 0.4 --out t.yaml --resume").status, 2);
    EXPECT_EQ(bench.text("t.yaml.work"), before);
}

TEST(TuneCommand, GoesOnFromAWorkFileToTheSameOutcome) {
    const Tune bench;
    const auto whole = bench.tune("--out a.yaml --table a.tsv");
    ASSERT_EQ(whole.status, 0) << whole.err;
    // Work as a stop leaves it: the sweep's first half.
    ASSERT_EQ(bench.tune("--part 1/1 --out b.yaml").status, 0);
    auto work = bench.text("b.yaml.part-1-of-1");
    for (int line = 0; line < 12; ++line) {
        work.erase(work.rfind('\n', work.size() - 2) + 1);
    }
    write_text(bench.folder / "b.yaml.work", work + "swept\t3\t0."); // and a line that was cut
    const auto refused = bench.tune("--out b.yaml");
    EXPECT_EQ(refused.status, 2);
    EXPECT_NE(refused.err.find("--resume"), std::string::npos) << refused.err;
    const auto resumed = bench.tune("--out b.yaml --table b.tsv --resume");
    ASSERT_EQ(resumed.status, 0) << resumed.err;
    EXPECT_EQ(bench.text("a.yaml"), bench.text("b.yaml"));
    EXPECT_EQ(bench.text("a.tsv"), bench.text("b.tsv"));
}

TEST(TuneCommand, RefusesWorkOfOtherRecordingsLabelsOrGrids) {
    const Tune bench(40.0), other(41.0);
    ASSERT_EQ(bench.tune("--part 1/1 --out o.yaml").status, 0);
    std::filesystem::copy(bench.folder / "o.yaml.part-1-of-1", bench.folder / "o.yaml.work");
    const auto expect_refused = [&](const std::string& words) {
        const auto ran = bench.tune("--out o.yaml --resume");
        EXPECT_EQ(ran.status, 2);
        EXPECT_NE(ran.err.find(words), std::string::npos) << ran.err;
        EXPECT_EQ(std::count(ran.err.begin(), ran.err.end(), '\n'), 1) << ran.err;
    };
    const auto truth = bench.text("truth.tsv"), grid = bench.text("grid.yaml");
    write_text(bench.folder / "truth.tsv", truth.substr(0, truth.rfind('\n', truth.size() - 2) + 1));
    expect_refused("another set of ripples");
    write_text(bench.folder / "truth.tsv", truth);
    write_text(bench.folder / "grid.yaml", grid + "  veto: {deviations: 5}\n");
    expect_refused("another grid or plan");
    write_text(bench.folder / "grid.yaml", grid);
    std::filesystem::copy(other.folder / "r.wav", bench.folder / "r.wav",
                          std::filesystem::copy_options::overwrite_existing);
    expect_refused("another set of recordings");
}

TEST(TuneCommand, StopsAtCtrlCKeepsWhatIsDoneAndGoesOn) {
    const Tune bench(240.0);
    std::string grid = "detector:\n  method: [envelope]\n  filter: {low_hz: [";
    for (int low = 100; low < 160; ++low) {
        grid += std::to_string(low) + (low < 159 ? ", " : "], order: [2, 3, 4]}\n");
    }
    write_text(bench.folder / "grid.yaml", grid + "  threshold: {deviations: [4, 5]}\n");
    std::vector<std::string> words{MILLPOND_PROGRAM};
    std::istringstream line(Tune::arguments("--out o.yaml --threads 1"));
    words.insert(words.end(), std::istream_iterator<std::string>(line), {});
    Process process(words, bench.folder / "log", {"/dev/null", bench.folder.path(), 0});
    ASSERT_TRUE(test::wait_until([&] {
        return !process.running() ||
               (bench.has("o.yaml.work") && bench.text("o.yaml.work").find("\nswept\t") != std::string::npos);
    }));
    process.send(SIGINT);
    ASSERT_EQ(process.status(), 130) << process.err();
    EXPECT_NE(process.err().find("stopped: "), std::string::npos) << process.err();
    EXPECT_NE(process.err().find("of 360 settings are swept; the same command with --resume goes on"),
              std::string::npos)
        << process.err();
    EXPECT_FALSE(bench.has("o.yaml"));
    const auto work = bench.text("o.yaml.work");
    const auto lines = std::count(work.begin(), work.end(), '\n');
    EXPECT_GT(lines, 7); // the head and what was done ...
    EXPECT_LT(lines, 367);
    const auto resumed = bench.tune("--out o.yaml --resume");
    EXPECT_EQ(resumed.status, 0) << resumed.err;
    EXPECT_TRUE(bench.has("o.yaml"));
}

// `loop` runs `part` for every K of N.
void expect_parts_give_the_whole(const std::string& loop) {
    const Tune bench;
    const auto whole = bench.tune("--out whole/o.yaml --table whole/o.tsv --curve whole/c.tsv");
    EXPECT_EQ(whole.status, 2); // no such folder: refused before anything is swept
    std::filesystem::create_directories(bench.folder / "whole");
    std::filesystem::create_directories(bench.folder / "parts");
    const auto one = bench.tune("--out whole/o.yaml --table whole/o.tsv --curve whole/c.tsv");
    ASSERT_EQ(one.status, 0) << one.err;
    write_text(bench.folder / "job.sh", std::string(MILLPOND_PROGRAM) + " " +
                                            Tune::arguments("--out parts/o.yaml --threads 1 --part "
                                                            "$SLURM_ARRAY_TASK_ID/$SLURM_ARRAY_TASK_COUNT") +
                                            "\n");
    const auto ran = run(loop, bench.folder.path());
    ASSERT_EQ(ran.status, 0) << ran.err;
    const auto merged = bench.tune("--out parts/o.yaml --table parts/o.tsv --curve parts/c.tsv --merge");
    ASSERT_EQ(merged.status, 0) << merged.err;
    for (const std::string file : {"o.yaml", "o.tsv", "c.tsv"}) {
        EXPECT_EQ(bench.text("parts/" + file), bench.text("whole/" + file)) << file;
    }
    const auto before_the_path = [](const std::string& text) { return text.substr(0, text.find("\nsettings")); };
    EXPECT_EQ(before_the_path(merged.out), before_the_path(one.out));
}

// The variables are those that Slurm sets for the tasks of a job array (sbatch's manual, JOB ARRAYS), tasks 1 to N.
TEST(TuneParts, OfASlurmJobArrayGiveTheWholeByteForByte) {
    expect_parts_give_the_whole("for task in 3 1 5 2 4; do SLURM_ARRAY_TASK_COUNT=5 SLURM_ARRAY_TASK_ID=$task "
                                "sh job.sh || exit 1; done");
}

TEST(TuneParts, RunAtTheSameTimeGiveTheWholeByteForByte) {
    // GNU parallel where it is installed, else xargs, which every Debian has.
    const std::string one = "SLURM_ARRAY_TASK_COUNT=30 SLURM_ARRAY_TASK_ID={} sh job.sh";
    expect_parts_give_the_whole(test::has_program("parallel") ? "seq 30 | parallel -j 2 '" + one + "'"
                                                              : "seq 30 | xargs -P 2 -I {} sh -c '" + one + "'");
}

TEST(TuneParts, AreRefusedWhereTheyAreNoneOrThereAlready) {
    const Tune bench(40.0);
    for (const std::string part : {"0/3", "4/3", "3", "a/b", "1/0", "-1/3"}) {
        EXPECT_EQ(bench.tune("--out o.yaml --part=" + part).status, 2) << part;
    }
    ASSERT_EQ(bench.tune("--out o.yaml --part 2/3").status, 0);
    EXPECT_EQ(bench.tune("--out o.yaml --part 2/3").status, 2);
    EXPECT_EQ(bench.tune("--out o.yaml --part 2/3 --resume").status, 0); // a task that is run again
    const auto ran = bench.tune("--out o.yaml --merge");
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("no part 1 of 3"), std::string::npos) << ran.err;
}

} // namespace
} // namespace millpond
