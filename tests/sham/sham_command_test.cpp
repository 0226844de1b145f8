#include "recording/events_table.hpp"
#include "sham/schedule.hpp"
#include "support/files.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::run_millpond;
using test::TemporaryFolder;
using test::write_text;

TEST(ShamCommand, DelaysTheTriggersOfAnEventsTableAndNothingElse) {
    const TemporaryFolder folder;
    write_text(folder / "e.tsv", "onset\tduration\ttrial_type\tsample\n1\t0\tdetection\t1000\n1\t0\ttrigger\t1000\n"
                                 "2\t0\twithheld\t2000\n3\t0\ttrigger\t3000\n");
    const auto ran = run_millpond("sham delayed " + (folder / "e.tsv").string() +
                                  " --sampling-hz 1000 --delay-least-ms 200 --delay-most-ms 200 --out " +
                                  (folder / "s.tsv").string());
    ASSERT_EQ(ran.status, 0) << ran.err;
    EXPECT_EQ(read_schedule(folder / "s.tsv", Hertz{1000.0}), (Schedule{SampleIndex{1200}, SampleIndex{3200}}));
    EXPECT_NE(ran.out.find("median 2.000 s"), std::string::npos) << ran.out;
}

TEST(ShamCommand, RefusesAnEventsTableOfAnotherRate) {
    const TemporaryFolder folder;
    write_text(folder / "e.tsv", "onset\tduration\ttrial_type\tsample\n2\t0\ttrigger\t2000\n");
    EXPECT_EQ(run_millpond("sham delayed " + (folder / "e.tsv").string() + " --sampling-hz 1250 --out " +
                           (folder / "s.tsv").string())
                  .status,
              2);
}

TEST(ShamCommand, TakesTheRateOfASessionsTriggers) {
    const TemporaryFolder folder;
    std::string rows = "onset\tduration\ttrial_type\tsample\n";
    for (int i = 0; i < 200; ++i) {
        rows += std::to_string(2 * i) + "\t0\ttrigger\t" + std::to_string(2000 * i) + "\n";
    }
    write_text(folder / "e.tsv", rows);
    const auto ran = run_millpond("sham rate-matched --like " + (folder / "e.tsv").string() +
                                  " --duration-s 3600 --sampling-hz 1000 --out " + (folder / "s.tsv").string());
    ASSERT_EQ(ran.status, 0) << ran.err;
    EXPECT_NEAR(static_cast<double>(read_schedule(folder / "s.tsv", Hertz{1000.0}).size()), 1800.0, 130.0);
}

TEST(ShamCommand, RefusesAMinimumIntervalBelowTheLockOut) {
    const TemporaryFolder folder;
    EXPECT_EQ(
        run_millpond("sham rate-matched --rate-per-s 0.5 --duration-s 60 --sampling-hz 1000 --min-interval-ms 100 "
                     "--out " +
                     (folder / "s.tsv").string())
            .status,
        2);
    EXPECT_FALSE(std::filesystem::exists(folder / "s.tsv"));
}

TEST(ShamCommand, CheckRefusesAScheduleThatBreaksTheLimits) {
    const TemporaryFolder folder;
    write_text(folder / "s.tsv", "onset\tduration\ttrial_type\n1\t0\tscheduled\n1.1\t0\tscheduled\n");
    const auto arguments = "sham check " + (folder / "s.tsv").string() + " --sampling-hz 1000 ";
    EXPECT_EQ(run_millpond(arguments).status, 2);
    EXPECT_EQ(run_millpond(arguments + "--lockout-ms 80").status, 0);
}

} // namespace
} // namespace millpond
