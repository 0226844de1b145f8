#include "base/refusal.hpp"
#include "sham/rate_matched.hpp"
#include "sham/yoked.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

#include <fstream>

namespace millpond {
namespace {

using test::ask_scipy;
using test::TemporaryFolder;

constexpr Hertz rate{1000.0}; // a frame is 1 ms

Schedule at(std::initializer_list<std::uint64_t> frames) {
    Schedule places;
    for (const auto frame : frames) {
        places.push_back(SampleIndex{frame});
    }
    return places;
}

YokedPlan delayed_by(double least_ms, double most_ms, std::uint32_t per_second = 100) {
    YokedPlan plan;
    plan.least_delay_ms = least_ms;
    plan.most_delay_ms = most_ms;
    plan.max_pulses_per_second = per_second;
    return plan;
}

TEST(YokedSchedule, KeepsEachPlaceToTheSample) {
    const auto made = yoked_schedule(at({1000, 1040, 5000}), {}, rate);
    EXPECT_EQ(made.places, at({1000, 1040, 5000})) << "nothing is put off: check_schedule refuses it";
    EXPECT_EQ(made.put_off, 0U);
}

TEST(YokedSchedule, CountsFromAMomentOfTheSourceAndBeginsWhereItIsAsked) {
    YokedPlan plan;
    plan.moment = SampleIndex{2000};
    plan.start_s = 60.0;
    const auto made = yoked_schedule(at({1000, 2000, 5000}), plan, rate);
    EXPECT_EQ(made.places, at({60000, 63000}));
    EXPECT_EQ(made.before, 1U);
}

TEST(YokedSchedule, IsCutAtItsDurationAfterTheMoment) {
    YokedPlan plan;
    plan.moment = SampleIndex{1000};
    plan.start_s = 10.0;
    plan.duration_s = 2.0;
    const auto made = yoked_schedule(at({1000, 2999, 3000, 9000}), plan, rate);
    EXPECT_EQ(made.places, at({10000, 11999}));
    EXPECT_EQ(made.after, 2U);
}

TEST(YokedSchedule, PutsEachPlaceLaterByAFixedDelay) {
    const auto made = yoked_schedule(at({1000, 2000, 5000}), delayed_by(200.0, 200.0), rate);
    EXPECT_EQ(made.places, at({1200, 2200, 5200}));
    EXPECT_EQ(made.put_off, 0U);
}

TEST(YokedSchedule, DrawsDelaysUniformlyBetweenTheirEnds) {
    MILLPOND_NEEDS_SCIPY();
    Schedule triggers;
    for (std::uint64_t i = 1; i <= 3000; ++i) {
        triggers.push_back(SampleIndex{i * 60000});
    }
    const Hertz fine{30000.0};
    const auto made = yoked_schedule(triggers, delayed_by(150.0, 250.0), fine);
    std::vector<double> delays;
    for (std::size_t i = 0; i < triggers.size(); ++i) {
        delays.push_back(static_cast<double>(made.places[i] - triggers[i]) / fine.value);
    }
    const auto p = ask_scipy("tell(stats.kstest(x, stats.uniform(0.150, 0.100).cdf).pvalue)", delays);
    ASSERT_EQ(p.size(), 1U);
    EXPECT_GT(p[0], 0.01);
}

TEST(YokedSchedule, WithDelaysKeepsTheMinimumIntervalByPuttingOffSoThatTheCountStaysMatched) {
    const auto made = yoked_schedule(at({1000, 1100, 3000}), delayed_by(10.0, 10.0), rate);
    EXPECT_EQ(made.places, at({1010, 1160, 3010}));
    EXPECT_EQ(made.put_off, 1U);
    EXPECT_DOUBLE_EQ(made.longest_put_off_ms, 50.0);
}

TEST(YokedSchedule, WithDelaysKeepsTheMostPulsesASecondByPuttingOff) {
    EXPECT_EQ(yoked_schedule(at({1000, 1200, 1400}), delayed_by(10.0, 10.0, 2), rate).places, at({1010, 1210, 2010}));
}

TEST(YokedSchedule, WithDelaysKeepsTheMostPulsesAMinuteByPuttingOff) {
    auto plan = delayed_by(10.0, 10.0);
    plan.max_pulses_per_minute = 2;
    EXPECT_EQ(yoked_schedule(at({1000, 2000, 3000}), plan, rate).places, at({1010, 2010, 61010}));
}

TEST(YokedSchedule, RefusesDelaysThatContradictEachOther) {
    EXPECT_THROW(static_cast<void>(yoked_schedule(at({1}), delayed_by(20.0, 10.0), rate)), Refusal);
}

TEST(RateMatchedSchedule, IntervalsFollowTheShiftedExponentialLaw) {
    MILLPOND_NEEDS_SCIPY();
    RateMatchedPlan plan;
    plan.rate_per_s = 0.6;
    plan.duration_s = 7200.0;
    plan.max_pulses_per_second = 1000;
    const Hertz fine{30000.0};
    const auto made = rate_matched_schedule(plan, fine);
    EXPECT_EQ(made.put_off, 0U);
    // Mean interval 1/0.6 s, of which 0.150 s is dead time.
    const auto p = ask_scipy("tell(stats.kstest(x, stats.expon(0.150, 1/0.6 - 0.150).cdf).pvalue)",
                             intervals_s_of(made.places, fine));
    ASSERT_EQ(p.size(), 1U);
    EXPECT_GT(p[0], 0.01);
    EXPECT_NEAR(static_cast<double>(made.places.size()) / 7200.0, 0.6, 0.03);
}

TEST(RateMatchedSchedule, NeverBreaksTheLimitsItWasGiven) {
    RateMatchedPlan plan;
    plan.rate_per_s = 3.0;
    plan.duration_s = 600.0;
    plan.max_pulses_per_minute = 190;
    const auto made = rate_matched_schedule(plan, rate);
    EXPECT_GT(made.put_off, 0U);
    EXPECT_NO_THROW(check_schedule(made.places, {150.0, 4, 10000, 190, 10000, {}}, rate, "made"));
    EXPECT_LT(made.places.back().value, 600000U + 1000U);
}

TEST(RateMatchedSchedule, BeginsWhereItIsAskedAndLastsFromThereOn) {
    RateMatchedPlan plan;
    const auto from_the_start = rate_matched_schedule(plan, rate).places;
    plan.start_s = 60.0;
    const auto later = rate_matched_schedule(plan, rate).places;
    ASSERT_EQ(later.size(), from_the_start.size());
    for (std::size_t i = 0; i < later.size(); ++i) {
        EXPECT_NEAR(static_cast<double>(later[i] - from_the_start[i]), 60000.0, 1.0); // rounded to a sample anew
    }
}

TEST(RateMatchedSchedule, KeepsAwayFromRipplesAndKeepsItsRate) {
    RateMatchedPlan plan;
    plan.rate_per_s = 0.5;
    plan.duration_s = 3600.0;
    plan.keep_away_ms = 100.0;
    plan.max_pulses_per_second = 1;
    for (std::uint64_t i = 0; i < 1800; ++i) {
        plan.keep_away_from.push_back(
            {SampleIndex{i * 2000}, SampleIndex{i * 2000 + 40}, SampleIndex{i * 2000 + 80}, 0.0});
    }
    const auto made = rate_matched_schedule(plan, rate);
    for (const auto place : made.places) {
        const auto within = place.value % 2000;
        EXPECT_TRUE(within > 180 && within <= 1900) << place.value;
    }
    EXPECT_GT(made.put_off, 0U); // so that places put off are among those looked at
    EXPECT_NEAR(static_cast<double>(made.places.size()) / 3600.0, 0.5, 0.06);
}

TEST(RateMatchedSchedule, IsTheSameForTheSameSeedAndAnotherForAnother) {
    RateMatchedPlan plan;
    const auto first = rate_matched_schedule(plan, rate).places;
    EXPECT_EQ(rate_matched_schedule(plan, rate).places, first);
    plan.seed = 2;
    EXPECT_NE(rate_matched_schedule(plan, rate).places, first);
}

TEST(RateMatchedSchedule, RefusesARateThatTheMinimumIntervalCannotGive) {
    RateMatchedPlan plan;
    plan.rate_per_s = 7.0;
    plan.max_pulses_per_minute = 1000;
    EXPECT_THROW(static_cast<void>(rate_matched_schedule(plan, rate)), Refusal);
    plan.rate_per_s = 2.5;
    EXPECT_NO_THROW(static_cast<void>(rate_matched_schedule(plan, rate)));
    plan.max_pulses_per_minute = 149;
    EXPECT_THROW(static_cast<void>(rate_matched_schedule(plan, rate)), Refusal);
}

TEST(RateOfPlaces, IsTakenBetweenTheFirstAndTheLast) {
    EXPECT_DOUBLE_EQ(rate_per_s_of(at({1000, 2000, 5000}), rate, "x"), 0.5);
    EXPECT_THROW(static_cast<void>(rate_per_s_of(at({1000}), rate, "x")), Refusal);
}

void expect_check(const Schedule& schedule, const ScheduleLimits& limits, const std::string& said) {
    try {
        check_schedule(schedule, limits, rate, "x");
        EXPECT_EQ(said, "") << "taken";
    } catch (const Refusal& refusal) {
        EXPECT_NE(said, "") << refusal.what();
        EXPECT_NE(std::string(refusal.what()).find(said), std::string::npos) << refusal.what();
    }
}

TEST(ScheduleCheck, RefusesAPlaceWithinTheLockOutOrTooManyWithinASecondOrASession) {
    expect_check(at({0, 150, 300, 450, 1000}), {}, "");
    expect_check(at({0, 149}), {}, "the only such place");
    expect_check(at({0, 200, 349, 498}), {}, "place 3 at 0.3490 s: found 149.0 ms after the one before, 2 such places");
    expect_check(at({0, 150, 300, 450, 999}), {}, "one too many within one second");
    expect_check(at({0, 1000, 2000}), {150.0, 4, 3, 120, 10000, {}}, "");
    expect_check(at({0, 1000, 2000}), {150.0, 4, 2, 120, 10000, {}}, "as many pulses as one session may have, 2");
}

TEST(ScheduleCheck, RefusesTooManyWithinAMinuteOrAnEpoch) {
    const auto places = at({0, 30'000, 59'000, 60'000, 200'000});
    ScheduleLimits limits;
    limits.max_pulses_per_minute = 3;
    expect_check(places, limits, "");
    limits.max_pulses_per_minute = 2;
    expect_check(places, limits, "3 places within one minute; allowed: as many pulses as one minute may have, 2");
    limits = {};
    limits.max_pulses_per_epoch = 3;
    expect_check(places, limits, "5 places within one epoch");
    limits.epoch_starts_s = {0.0, 60.0}; // the place at 60 s is the second epoch's
    expect_check(places, limits, "");
}

TEST(ScheduleCheck, CountsHowNearPlacesComeToTheLimits) {
    const auto found = crowding(at({0, 100, 200, 999, 1000, 5000}), {150.0, 3, 100, 120, 10000, {}}, rate);
    EXPECT_EQ(found.within_lockout, 3U);
    EXPECT_EQ(found.first_within_lockout, 1U);
    EXPECT_EQ(found.most_in_a_second, 4U); // 0 to 999, and 100 to 1000
    EXPECT_EQ(found.beyond_second, 2U);
    EXPECT_EQ(found.first_beyond_second, 3U);
}

TEST(ScheduleFile, ReadsBackWhatWasWritten) {
    const TemporaryFolder folder;
    const auto file = folder / "schedule.tsv";
    const Hertz odd{30000.0};
    const auto places = at({0, 4501, 1234567, 98765432});
    write_schedule(file, places, odd);
    EXPECT_EQ(read_schedule(file, odd), places);
}

TEST(ScheduleFile, IsATableWithOnsetAndDurationFirstAsInBids) {
    const TemporaryFolder folder;
    write_schedule(folder / "schedule.tsv", at({1500}), rate);
    std::ifstream file(folder / "schedule.tsv");
    std::string header, row;
    std::getline(file, header);
    std::getline(file, row);
    EXPECT_EQ(header, "onset\tduration\ttrial_type\tsample");
    EXPECT_EQ(row, "1.5\t0\tscheduled\t1500");
}

void expect_refused(const std::string& rows, const std::string& said) {
    const TemporaryFolder folder;
    std::ofstream(folder / "schedule.tsv") << rows;
    try {
        static_cast<void>(read_schedule(folder / "schedule.tsv", rate));
        ADD_FAILURE() << "taken: " << rows;
    } catch (const Refusal& refusal) {
        EXPECT_NE(std::string(refusal.what()).find(said), std::string::npos) << refusal.what();
    }
}

TEST(ScheduleFile, RefusesWhatIsNoSchedule) {
    expect_refused("onset\tduration\ttrial_type\n1\t0\tripple\n", "trial_type");
    expect_refused("onset\tduration\ttrial_type\n-1\t0\tscheduled\n", "0 or more");
    expect_refused("onset\tduration\ttrial_type\n2\t0\tscheduled\n1\t0\tscheduled\n", "ascending");
    expect_refused("onset\tduration\ttrial_type\n2\t0\tscheduled\n2\t0\tscheduled\n", "ascending");
    expect_refused("onset\tduration\ttrial_type\nnan\t0\tscheduled\n", "onset");
    expect_refused("onset\tduration\ttrial_type\tsample\n2\t0\tscheduled\t2500\n", "made for this stream");
}

} // namespace
} // namespace millpond
