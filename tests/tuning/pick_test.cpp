#include "app/tune_outcome.hpp"
#include "app/tune_tables.hpp"
#include "tuning/pick.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using Places = std::vector<std::size_t>;

SweepResult result_of(double hit_rate, double false_training, double false_held_out, double latency = 20.0) {
    SweepResult result;
    result.training.ripples = result.held_out.ripples = 100;
    result.training.hits = result.held_out.hits = static_cast<std::uint64_t>(hit_rate * 100.0 + 0.5);
    result.training.false_per_minute = false_training;
    result.training.latency_median_ms = latency;
    result.training.eligible_minutes = result.held_out.eligible_minutes = 100.0;
    result.held_out.false_per_minute = false_held_out;
    return result;
}

TEST(Pick, FindsMostAmongThoseAtTheLimitOnTheTrainingParts) {
    const std::vector results{result_of(0.9, 0.5, 0.5), result_of(0.99, 1.2, 0.0), result_of(0.95, 1.0, 1.0)};
    const auto picked = pick(results, 1.0);
    ASSERT_TRUE(picked);
    EXPECT_EQ(picked->index, 2U);
    EXPECT_EQ(picked->passed_over, 0U);
}

TEST(Pick, PassesOverTheOneThatIsAboveTheLimitOnTheHeldOutParts) {
    const std::vector results{result_of(0.9, 0.5, 0.5), result_of(0.99, 0.8, 1.4)};
    const auto picked = pick(results, 1.0);
    ASSERT_TRUE(picked);
    EXPECT_EQ(picked->index, 0U);
    EXPECT_EQ(picked->passed_over, 1U);
}

TEST(Pick, PrefersTheShorterLatencyAtEqualHitRateThenFewerFalse) {
    EXPECT_EQ(pick(std::vector{result_of(0.9, 0.5, 0.5, 25.0), result_of(0.9, 0.9, 0.5, 15.0)}, 1.0)->index, 1U);
    EXPECT_EQ(pick(std::vector{result_of(0.9, 0.9, 0.5), result_of(0.9, 0.5, 0.5)}, 1.0)->index, 1U);
}

TEST(Pick, IsNoneWhereNothingKeepsTheLimitOrNothingIsKnown) {
    EXPECT_FALSE(pick(std::vector{result_of(0.9, 2.0, 0.0), result_of(0.9, 0.0, 2.0)}, 1.0));
    EXPECT_FALSE(pick(std::vector{result_of(0.9, not_known, 0.0), result_of(0.9, 0.0, not_known)}, 1.0));
}

TEST(Front, HoldsWhatNoOtherBeatsInHitRateFalseAndLatencyAtOnce) {
    const std::vector results{result_of(0.9, 1.0, 0.0, 20.0),        // best in hit rate for its false rate
                              result_of(0.8, 0.2, 0.0, 25.0),        // fewest false
                              result_of(0.8, 1.0, 0.0, 20.0),        // beaten by the first
                              result_of(0.7, 2.0, 0.0, 10.0),        // soonest
                              result_of(0.9, 1.0, 0.0, 20.0),        // equal to the first, which stands for it
                              result_of(0.95, not_known, 0.0, 1.0)}; // not scored
    EXPECT_EQ(front(results), (Places{1, 0, 3}));
}

TEST(Finalists, AreTheBestOfTheRankingAndTheFrontThinnedEvenly) {
    std::vector<SweepResult> results;
    for (int i = 0; i < 40; ++i) { // a front: each more hits, more false
        results.push_back(result_of(0.5 + 0.01 * i, 0.05 * i, 0.0));
    }
    results.push_back(result_of(0.99, 50.0, 0.0)); // on the front, but at 50 times the limit
    const auto chosen = finalists(results, 1.0, 10);
    ASSERT_EQ(chosen.size(), 10U);
    for (const std::size_t best : {16, 17, 18, 19, 20}) { // 20: 1.0 false per minute
        EXPECT_TRUE(std::count(chosen.begin(), chosen.end(), best) == 1) << best;
    }
    EXPECT_EQ(chosen.front(), 0U);
    EXPECT_EQ(chosen.back(), 39U);
    EXPECT_EQ(finalists(std::vector{results[3]}, 1.0, 10), (Places{0}));
    EXPECT_TRUE(finalists({}, 1.0, 10).empty());
}

TEST(Outcome, ConfirmsTheNextOfTheRankingWhereNoneOfTheFirstCanBePicked) {
    SweepResults swept, confirmed(30);
    for (int i = 0; i < 30; ++i) {
        swept.push_back(result_of(0.9 - 0.01 * i, 0.5, 0.5));
    }
    const auto first = next_to_confirm(outcome_of(swept, confirmed, 1.0), 1.0);
    ASSERT_FALSE(first.empty());
    EXPECT_EQ(first.front(), 0U);
    for (const auto place : first) {
        confirmed[place] = result_of(0.9, 0.5, 3.0); // above the limit on held-out parts
    }
    auto outcome = outcome_of(swept, confirmed, 1.0);
    EXPECT_FALSE(outcome.picked);
    const auto second = next_to_confirm(outcome, 1.0);
    ASSERT_EQ(second.size(), finalist_count);
    EXPECT_EQ(second.front(), first.back() + 1);
    confirmed[second.front()] = result_of(0.8, 0.5, 0.5);
    outcome = outcome_of(swept, confirmed, 1.0);
    EXPECT_EQ(outcome.picked, second.front());
    EXPECT_EQ(outcome.passed_over, first.size());
    EXPECT_TRUE(next_to_confirm(outcome, 1.0).empty());
}

// Two axes that tell settings apart, one that does not.
TuneCandidates candidates_for(std::size_t count) {
    TuneCandidates candidates{{{"filter.order", {"2"}}, {"threshold.deviations", {}}}, {}, {}, 0};
    for (std::size_t i = 0; i < count; ++i) {
        candidates.settings.emplace_back();
        candidates.axes[1].values.push_back(std::to_string(i + 3));
        candidates.values.push_back({"2", std::to_string(i + 3)});
    }
    return candidates;
}

TEST(Tables, SayInOneSentenceWhyThePickIsThePick) {
    const SweepResults swept{result_of(0.9, 0.5, 0.5), result_of(0.95, 0.9, 1.5), result_of(0.8, 0.2, 0.2)};
    const auto outcome = outcome_of(swept, swept, 1.0);
    const auto sentence = pick_sentence(candidates_for(3), outcome, 1.0);
    EXPECT_EQ(sentence.find("picked deviations 3, because of the 3 confirmed settings at 1 false per minute or fewer"),
              0U)
        << sentence;
    EXPECT_NE(sentence.find(" once 1 ranked before it is left out"), std::string::npos) << sentence;
    EXPECT_NE(sentence.find("(90.0 % at 0.50 false per minute, 20.0 ms after their onset)"), std::string::npos);
    EXPECT_NE(sentence.find("the next best finds 80.0 %"), std::string::npos);
    EXPECT_EQ(std::count(sentence.begin(), sentence.end(), '\n'), 1);
}

TEST(Tables, SetTrainingBesideHeldOutAndMarkThePick) {
    const SweepResults swept{result_of(0.9, 0.5, 0.5), result_of(0.95, 3.0, 4.0), result_of(0.8, 0.2, 0.2)};
    const auto outcome = outcome_of(swept, swept, 1.0);
    const auto text = front_summary(candidates_for(3), outcome, 1.0, 20);
    const auto first = text.find("\n           5 |"), second = text.find("\n*          3 |"),
               third = text.find("\n           4 |"); // by rising false per minute
    ASSERT_NE(first, std::string::npos) << text;
    EXPECT_LT(first, second);
    EXPECT_LT(second, third);
    EXPECT_NE(text.find("3.00   20.0   n/a |    95/100    95.0      4.00"), std::string::npos) << text;
    const auto short_text = front_summary(candidates_for(3), outcome, 1.0, 1);
    EXPECT_NE(short_text.find("\n*          3 |"), std::string::npos) << short_text;
    EXPECT_EQ(short_text.find("\n           4 |"), std::string::npos) << short_text;
}

TEST(Tables, DrawTheFrontOfBothParts) {
    const SweepResults swept{result_of(1.0, 10.0, 10.0), result_of(0.8, 1.0, 3.0), result_of(0.5, 0.1, 0.1)};
    const auto picture = curve_picture(outcome_of(swept, swept, 1.0), 1.0);
    EXPECT_NE(picture.find("\n100.0 |" + std::string(30, ' ') + ":" + std::string(29, ' ') + "#\n"), std::string::npos)
        << picture;
    EXPECT_NE(picture.find("\n 50.0 |#"), std::string::npos) << picture;
    EXPECT_NE(picture.find("*" + std::string(13, ' ') + "o\n"), std::string::npos) << picture; // 0.5 decades apart
    EXPECT_TRUE(curve_picture({}, 1.0).empty());
}

TEST(Tables, DoubtFiguresFromFewLabelsOrFewMinutes) {
    auto few = result_of(0.9, 0.5, 0.5);
    few.held_out.ripples = 20;
    few.held_out.hits = 18;
    few.training.ripples = 1000;
    few.training.hits = 900;
    // 18 of 20: Wilson 1927, worked out by hand in tests/referee/scoring_test.cpp's way: 69.9 to 97.2 %.
    const auto text = doubts(few, 1.0);
    EXPECT_NE(text.find("few labels  held out: 20 ripples leave the hit rate anywhere from 69.9 to 97.2 %"),
              std::string::npos)
        << text;
    EXPECT_EQ(text.find("training"), std::string::npos) << text;
    few.training.eligible_minutes = 2.0;
    EXPECT_NE(doubts(few, 1.0).find("few minutes training"), std::string::npos);
    few.held_out = few.training;
    few.training.eligible_minutes = few.held_out.eligible_minutes = 60.0;
    EXPECT_EQ(doubts(few, 1.0), "");
}

TEST(Tables, HoldEverySettingAndTheCurveOnlyTheFront) {
    const SweepResults swept{result_of(0.9, 0.5, 0.5), result_of(0.8, 0.6, 0.5), result_of(0.95, 3.0, 0.2)};
    SweepResults confirmed(3);
    confirmed[0] = swept[0];
    const auto outcome = outcome_of(swept, confirmed, 1.0);
    const auto table = sweep_table(candidates_for(3), outcome), curve = curve_table(candidates_for(3), outcome);
    EXPECT_EQ(std::count(table.begin(), table.end(), '\n'), 4);
    EXPECT_NE(table.find("\n2\t3\t0.00\t1\t1\t90\t100\t0.9000\t0.5000\t20.00"), std::string::npos) << table;
    EXPECT_NE(table.find("\n2\t4\t0.00\t0\t0\t80\t100"), std::string::npos) << table;
    EXPECT_EQ(std::count(curve.begin(), curve.end(), '\n'), 3);
    for (const auto* text : {&table, &curve}) { // every line has the header's number of cells
        std::size_t header = 0, cells = 0, line = 0;
        for (const char c : *text) {
            cells += c == '\t' ? 1 : 0;
            if (c == '\n') {
                header = line++ == 0 ? cells : header;
                EXPECT_EQ(cells, header) << *text;
                cells = 0;
            }
        }
    }
}

} // namespace
} // namespace millpond
