#include "sham/schedule.hpp"
#include "support/files.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using test::Ran;
using test::run_millpond;
using test::TemporaryFolder;
using test::write_text;

class ShamCommand : public ::testing::Test {
  protected:
    [[nodiscard]] std::string path(const std::string& name) const { return (folder_ / name).string(); }
    [[nodiscard]] Schedule made(const std::string& name = "s.tsv") const {
        return read_schedule(folder_ / name, Hertz{1000.0});
    }
    Ran sham(const std::string& arguments) { return run_millpond("sham " + arguments + " --out " + path("s.tsv")); }
    /// A table of a session at 1000 Hz; rows are `trial_type` and sample.
    std::string table(const std::vector<std::pair<std::string, int>>& rows, const std::string& name = "e.tsv") {
        std::string text = "onset\tduration\ttrial_type\tsample\ttext\n";
        for (const auto& [type, sample] : rows) {
            text += std::to_string(sample / 1000.0) + "\t0\t" + type + "\t" + std::to_string(sample) +
                    (type == "epoch" ? "\trest 1\n" : "\tn/a\n");
        }
        write_text(folder_ / name, text);
        return path(name);
    }
    std::string settings(const std::string& arbiter = "", const std::string& schedule = "",
                         const std::string& limits = "") {
        write_text(folder_ / "rig.yaml",
                   "stream: {port: 5004, encoding: L16, rate_hz: 1000, channels: 1, microvolts_per_count: 1}\n"
                   "arbiter: {" +
                       arbiter + "}\nschedule: {" + schedule + "}\nlimits: {" + limits + "}\n");
        return path("rig.yaml");
    }
    static void expect_refused(const Ran& ran, const std::string& said) {
        EXPECT_EQ(ran.status, 2);
        EXPECT_EQ(std::count(ran.err.begin(), ran.err.end(), '\n'), 1) << ran.err;
        EXPECT_NE(ran.err.find(said), std::string::npos) << ran.err;
        EXPECT_EQ(ran.out, "");
    }
    static void expect_says(const Ran& ran, const std::string& said) {
        EXPECT_EQ(ran.status, 0) << ran.err;
        EXPECT_NE(ran.out.find(said), std::string::npos) << ran.out;
    }

    const TemporaryFolder folder_;
};

TEST_F(ShamCommand, YokesToThePulsesThatWereGiven) {
    const auto events = table({{"detection", 1000}, {"trigger", 1000}, {"trigger", 3000}, {"order", 3200}});
    expect_says(sham("yoked " + events + " --sampling-hz 1000"), "e.tsv: 1 orders: the pulses that were given");
    EXPECT_EQ(made(), (Schedule{SampleIndex{3200}}));
}

TEST_F(ShamCommand, YokesToTriggersWhereNoPulseWasGivenAndToNothingElse) {
    const auto events = table({{"detection", 1000}, {"trigger", 1000}, {"withheld", 2000}, {"trigger", 3000}});
    expect_says(sham("yoked " + events + " --sampling-hz 1000"), "e.tsv: 2 triggers: no order in it");
    EXPECT_EQ(made(), (Schedule{SampleIndex{1000}, SampleIndex{3000}}));
}

TEST_F(ShamCommand, DelaysWhatItYokesToWhereAsked) {
    const auto events = table({{"trigger", 1000}, {"trigger", 3000}});
    const auto ran = sham("yoked " + events + " --sampling-hz 1000 --delay-least-ms 200 --delay-most-ms 200");
    expect_says(ran, "median 2.000 s");
    EXPECT_EQ(made(), (Schedule{SampleIndex{1200}, SampleIndex{3200}}));
}

TEST_F(ShamCommand, AlignsAnEpochOfTheSourceWithTheStartAndCutsAtTheDuration) {
    const auto events = table({{"trigger", 1000}, {"epoch", 2000}, {"trigger", 3000}, {"trigger", 9000}});
    const auto ran = sham("yoked " + events + " --sampling-hz 1000 --align 'rest 1' --start-s 60 --duration-s 5");
    expect_says(ran, "rest 1 (2.000 s of it) at 60.000 s; left out: 1 places before it, 1 after the duration");
    EXPECT_EQ(made(), (Schedule{SampleIndex{61000}}));
    expect_refused(sham("yoked " + events + " --sampling-hz 1000 --align armed"), "first, rest 1");
}

TEST_F(ShamCommand, RefusesATableWithoutItsRateOrOfAnotherOne) {
    const auto events = table({{"trigger", 2000}});
    expect_refused(sham("yoked " + events), "--sampling-hz: found nothing");
    expect_refused(sham("yoked " + events + " --sampling-hz 1250"), "the events of a stream of 1250 Hz");
}

TEST_F(ShamCommand, TakesTheRateOfASessionsPulsesAndComparesIntervalsWithThem) {
    std::vector<std::pair<std::string, int>> rows;
    for (int i = 0; i < 200; ++i) {
        rows.push_back({"trigger", 2000 * i});
    }
    const auto ran = sham("rate-matched --like " + table(rows) + " --duration-s 3600 --sampling-hz 1000");
    expect_says(ran, "0.5000 /s for 3600 s from 0 s on: 1800 places expected");
    expect_says(ran, "compared    Kolmogorov-Smirnov, two-sided: D 0.");
    EXPECT_NEAR(static_cast<double>(made().size()), 1800.0, 130.0);
}

TEST_F(ShamCommand, MakesAScheduleFromASettingsFileAlone) {
    const auto file = settings("condition: rate_matched, schedule_file: control.tsv, lockout_ms: 400",
                               "rate_per_s: 0.4, start_s: 30, duration_s: 600, seed: 5", "max_pulses_per_second: 1");
    expect_says(run_millpond("sham rate-matched --settings " + file), "0.4000 /s for 600 s from 30 s on");
    const auto places = made("control.tsv");
    EXPECT_GE(places.front().value, 30'000U);
    EXPECT_LE(places.back().value, 631'000U);
    EXPECT_LE(crowding(places, {}, Hertz{1000.0}).most_in_a_second, 1U);
    expect_says(run_millpond("sham check " + path("control.tsv") + " --settings " + file), "(400 ms)");
}

TEST_F(ShamCommand, OptionsTakeThePlaceOfTheSchedulesOwnSettingsButNotOfTheLimits) {
    const auto file = settings("lockout_ms: 400", "rate_per_s: 0.4");
    expect_says(sham("rate-matched --settings " + file + " --rate-per-s 0.2 --duration-s 1000"),
                "0.2000 /s for 1000 s from 0 s on: 200 places expected, no two nearer than 400 ms");
    EXPECT_EQ(sham("rate-matched --settings " + file + " --lockout-ms 100").status, 2);
    EXPECT_EQ(sham("rate-matched --settings " + file + " --sampling-hz 1000").status, 2);
}

TEST_F(ShamCommand, WithoutSettingsAsksForWhatItNeeds) {
    expect_refused(sham("rate-matched --duration-s 60 --sampling-hz 1000"), "neither --rate-per-s nor --like");
    expect_refused(sham("rate-matched --rate-per-s 1 --sampling-hz 1000"), "--duration-s: found nothing");
    expect_refused(sham("rate-matched --rate-per-s 1 --duration-s 60"), "--sampling-hz: found nothing");
    expect_refused(run_millpond("sham rate-matched --settings " + settings()), "--out: found nothing");
}

TEST_F(ShamCommand, RefusesAMinimumIntervalBelowTheLockOut) {
    expect_refused(sham("rate-matched --rate-per-s 0.5 --duration-s 60 --sampling-hz 1000 --min-interval-ms 100"),
                   "--min-interval-ms: found 100");
    EXPECT_FALSE(std::filesystem::exists(path("s.tsv")));
}

TEST_F(ShamCommand, RefusesAScheduleThatBreaksTheLimitsAndWritesNothing) {
    const auto events = table({{"trigger", 1000}, {"trigger", 1100}, {"trigger", 1200}});
    expect_refused(sham("yoked " + events + " --sampling-hz 1000"), "100.0 ms after the one before, 2 such places");
    expect_refused(sham("yoked " + events + " --sampling-hz 1000 --lockout-ms 50 --max-pulses-per-session 2"),
                   "as many pulses as one session may have, 2");
    EXPECT_FALSE(std::filesystem::exists(path("s.tsv")));
}

TEST_F(ShamCommand, SaysWhatShareLiesInRipples) {
    const auto events = table({{"trigger", 1000}, {"trigger", 3000}});
    write_text(folder_ / "r.tsv", "onset\tduration\ttrial_type\n0.99\t0.1\tripple\n5.99\t0.1\tripple\n");
    const auto ran = sham("yoked " + events + " --sampling-hz 1000 --start-s 10 --ripples " + path("r.tsv"));
    expect_says(ran, "1 of 2 places, 50.0 %"); // the table's ripples move with the places
    expect_says(ran, "rate x mean duration = 0.2000 /s x 101.0 ms");
    const auto given = run_millpond("sham check " + path("s.tsv") +
                                    " --sampling-hz 1000 --ripple-rate-per-s 0.6 --ripple-mean-ms 96.7");
    expect_says(given, "5.8 % of places expected in ripples");
}

TEST_F(ShamCommand, CheckRefusesAScheduleThatBreaksTheLimits) {
    write_text(folder_ / "s.tsv", "onset\tduration\ttrial_type\n1\t0\tscheduled\n1.1\t0\tscheduled\n");
    const auto arguments = "sham check " + path("s.tsv") + " --sampling-hz 1000 ";
    expect_refused(run_millpond(arguments), "the only such place");
    EXPECT_EQ(run_millpond(arguments + "--lockout-ms 80").status, 0);
}

TEST_F(ShamCommand, CheckComparesWithASource) {
    const auto events = table({{"trigger", 1000}, {"trigger", 3000}, {"trigger", 3500}});
    ASSERT_EQ(sham("yoked " + events + " --sampling-hz 1000").status, 0);
    expect_says(run_millpond("sham check " + path("s.tsv") + " --sampling-hz 1000 --source " + events),
                "D 0.0000, p 1 (exact; 2 and 2 intervals");
}

} // namespace
} // namespace millpond
