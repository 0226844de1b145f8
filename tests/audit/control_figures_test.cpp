// Plan and fact of delayed and scheduled pulses, from events that are told one by one: every figure is known
// beforehand.
#include "audit/audit.hpp"
#include "audit/audit_text.hpp"
#include "audit/control_figures.hpp"
#include "audit/hand_made_session.hpp"
#include "recording/events_table.hpp"
#include "support/process.hpp"
#include "support/python.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using namespace test;

constexpr Hertz rate{1000.0}; // a frame is 1 ms

class Told {
  public:
    Told& slot(std::uint64_t from, std::uint64_t at, std::uint32_t number, PulseOrigin origin, bool ordered,
               bool caught = false) {
        const TriggerDetail detail{from, number, origin, caught ? 1U : 0U, 0};
        events_.push_back(Event::make(EventKind::slot, 0, SampleIndex{at}, detail));
        if (ordered) {
            events_.push_back(Event::make(EventKind::order, 0, SampleIndex{at}, detail));
        }
        return *this;
    }
    Told& omitted(std::uint64_t from, std::uint64_t at, std::uint32_t number, PulseOrigin origin, Rule rule) {
        events_.push_back(Event::make(EventKind::omitted, static_cast<std::uint8_t>(rule), SampleIndex{at},
                                      TriggerDetail{from, number, origin, 0, 0}));
        return *this;
    }
    [[nodiscard]] ControlFigures figures(const Schedule* schedule = nullptr,
                                         const KnownRipples* ripples = nullptr) const {
        return control_figures(events_, schedule, ripples, rate);
    }
    [[nodiscard]] const std::vector<Event>& events() const { return events_; }

  private:
    std::vector<Event> events_;
};

Schedule at(std::initializer_list<std::uint64_t> frames) {
    Schedule places;
    for (const auto frame : frames) {
        places.push_back(SampleIndex{frame});
    }
    return places;
}

/// Six places planned: given, given 40 ms late, omitted twice, given 20 ms late, not reached.
Told a_played_schedule() {
    Told told;
    told.slot(1000, 1000, 1, PulseOrigin::schedule, true)
        .slot(2000, 2040, 2, PulseOrigin::schedule, true)
        .omitted(3000, 3250, 3, PulseOrigin::schedule, Rule::held)
        .omitted(4000, 4000, 4, PulseOrigin::schedule, Rule::not_armed)
        .slot(5000, 5020, 5, PulseOrigin::schedule, true);
    return told;
}

TEST(ControlFigures, CountPlacesPlannedGivenOmittedByRuleAndNotReached) {
    const auto places = at({1000, 2000, 3000, 4000, 5000, 6000});
    const auto figures = a_played_schedule().figures(&places);
    const auto& f = figures.scheduled;
    EXPECT_EQ(f.planned, 6U);
    EXPECT_EQ(f.came, 5U);
    EXPECT_EQ(f.given, 3U);
    EXPECT_EQ(f.phantoms, 0U);
    EXPECT_EQ(f.omitted, 2U);
    EXPECT_EQ(f.omitted_by[static_cast<std::size_t>(Rule::held)], 1U);
    EXPECT_EQ(f.omitted_by[static_cast<std::size_t>(Rule::not_armed)], 1U);
    EXPECT_EQ(f.not_reached, 1U);
    EXPECT_EQ(figures.about_schedule, "");
    EXPECT_EQ(figures.delayed.came, 0U);
}

TEST(ControlFigures, SayHowLongPlacesWereHeld) {
    const auto f = a_played_schedule().figures().scheduled;
    EXPECT_EQ(f.held, 2U);
    EXPECT_DOUBLE_EQ(f.held_ms.least, 20.0);
    EXPECT_DOUBLE_EQ(f.held_ms.median, 30.0);
    EXPECT_DOUBLE_EQ(f.held_ms.most, 40.0);
}

TEST(ControlFigures, WithoutTheFileDoNotGuessWhatWasNotReached) {
    const auto figures = a_played_schedule().figures();
    EXPECT_FALSE(figures.scheduled.planned.has_value());
    EXPECT_FALSE(figures.scheduled.not_reached.has_value());
    EXPECT_EQ(control_json(figures)["scheduled"]["not_reached"], nullptr);
    EXPECT_EQ(control_text(figures).find("not reached"), std::string::npos);
}

TEST(ControlFigures, KnowAFileThatIsNoLongerTheOneThatWasPlayed) {
    const auto other = at({1000, 2001, 3000, 4000, 5000, 6000}), shorter = at({1000, 2000});
    EXPECT_EQ(a_played_schedule().figures(&other).about_schedule,
              "its file has been changed since: place 2 was at sample 2000");
    EXPECT_NE(a_played_schedule().figures(&shorter).about_schedule, "");
    EXPECT_FALSE(a_played_schedule().figures(&other).scheduled.planned.has_value());
}

TEST(ControlFigures, TellPhantomsAndCatchTrialsFromPulses) {
    Told told;
    told.slot(1000, 1200, 1, PulseOrigin::delay, true)
        .slot(2000, 2180, 2, PulseOrigin::delay, false, true)
        .slot(3000, 3000, 1, PulseOrigin::schedule, false)
        .slot(4000, 4260, 3, PulseOrigin::delay, true);
    const auto figures = told.figures();
    EXPECT_EQ(figures.delayed.given, 2U);
    EXPECT_EQ(figures.delayed.catch_trials, 1U);
    EXPECT_EQ(figures.delayed.phantoms, 0U);
    EXPECT_DOUBLE_EQ(figures.delayed.after_trigger_ms.median, 200.0);
    EXPECT_DOUBLE_EQ(figures.delayed.after_trigger_ms.most, 260.0);
    EXPECT_EQ(figures.scheduled.phantoms, 1U);
    EXPECT_EQ(figures.scheduled.given, 0U) << "the order of trigger 1 is not that of place 1";
}

TEST(ControlFigures, SayWhichShareLiesInRipples) {
    const Ripples ripples{{SampleIndex{990}, SampleIndex{1000}, SampleIndex{1080}, 0.0},
                          {SampleIndex{5025}, SampleIndex{5050}, SampleIndex{5100}, 0.0}};
    const KnownRipples labelled{ripples, 0.0, {}}, early{ripples, 10.0, {}},
        partly{ripples, 0.0, {{SampleIndex{2000}, SampleIndex{2100}}}};
    EXPECT_EQ(a_played_schedule().figures(nullptr, &labelled).scheduled.given_in_ripples.count, 1U);
    EXPECT_EQ(a_played_schedule().figures(nullptr, &early).scheduled.given_in_ripples.count, 2U);
    const auto share = a_played_schedule().figures(nullptr, &partly).scheduled.given_in_ripples;
    EXPECT_EQ(share.count, 1U);
    EXPECT_EQ(share.of, 2U) << "nobody can tell about the one at 2040";
}

TEST(ControlFigures, ShareInRipplesHasTheIntervalOfWilson) {
    MILLPOND_NEEDS_SCIPY();
    const Ripples ripples{{SampleIndex{990}, SampleIndex{1000}, SampleIndex{1080}, 0.0}};
    const KnownRipples known{ripples, 0.0, {}};
    const auto share = a_played_schedule().figures(nullptr, &known).scheduled.given_in_ripples;
    const auto expected = ask_scipy(
        "r = stats.binomtest(1, 3).proportion_ci(0.95, method='wilson')\ntell([r.low, r.high])", std::vector<double>{});
    EXPECT_NEAR(share.low, expected.at(0), 1e-9);
    EXPECT_NEAR(share.high, expected.at(1), 1e-9);
}

TEST(ControlFigures, CompareIntervalsAsTheyCameWithThosePlanned) {
    MILLPOND_NEEDS_SCIPY();
    const auto f = a_played_schedule().figures().scheduled;
    const auto expected = ask_scipy("r = stats.ks_2samp([1.04, 2.98], [1, 1, 1, 1], method='exact')\n"
                                    "tell([r.statistic, r.pvalue])");
    EXPECT_DOUBLE_EQ(f.kept_intervals_s.least, 1.04);
    EXPECT_DOUBLE_EQ(f.planned_intervals_s.most, 1.0);
    EXPECT_NEAR(f.compared.d, expected.at(0), 1e-12);
    EXPECT_NEAR(f.compared.p, expected.at(1), 1e-12);
}

TEST(ControlFigures, SayTheSameAsTextJsonAndTable) {
    const auto places = at({1000, 2000, 3000, 4000, 5000, 6000});
    const auto figures = a_played_schedule().figures(&places);
    const auto text = control_text(figures);
    EXPECT_NE(text.find("scheduled: 6 planned, 5 came, 3 given, 0 phantom, 0 catch trials"), std::string::npos) << text;
    EXPECT_NE(text.find("omitted 2: 1 not armed, 1 held"), std::string::npos) << text;
    EXPECT_NE(text.find("not reached 1"), std::string::npos) << text;
    EXPECT_NE(text.find("held 2: median 30.0, "), std::string::npos) << text;
    const auto json = control_json(figures)["scheduled"];
    EXPECT_EQ(json["planned"], 6);
    EXPECT_EQ(json["given"], 3);
    EXPECT_EQ(json["omitted_by"]["held"], 1);
    EXPECT_EQ(json["held_ms"]["median"], 30.0);
    EXPECT_EQ(json["given_in_ripples"]["share"], nullptr);
    const TemporaryFolder folder;
    const auto rows = read_events_table(folder.file("schedule.tsv", control_table(figures, rate)), rate.value);
    ASSERT_EQ(rows.size(), 6U);
    EXPECT_EQ(rows[1].trial_type, "given");
    EXPECT_EQ(rows[1].sample, 2040);
    EXPECT_EQ(rows[1].extra.at("later_ms"), "40.000");
    EXPECT_EQ(rows[2].extra.at("rule"), "held");
    EXPECT_EQ(rows[5].trial_type, "not reached");
}

TEST(ControlFigures, AreSilentWhereThereWereNoMoments) {
    EXPECT_EQ(control_text(Told().figures()), "");
    EXPECT_EQ(control_json(Told().figures())["scheduled"]["came"], 0);
}

// The engine's own events, by the command: played once with pulses, once without, on the same samples.
class PlayedSession : public ::testing::Test {
  protected:
    std::filesystem::path play(Condition condition, const TemporaryFolder& folder) {
        auto settings = test_engine_settings();
        settings.arbiter.condition = condition;
        settings.arbiter.schedule_file = (temp_ / "control.tsv").string();
        settings.arbiter.start_armed = true;
        settings.arbiter.hold.schedule = true;
        write_schedule(settings.arbiter.schedule_file, places_, test_rate);
        HandMadeLoop loop(folder, settings, places_);
        run_eventful(loop);
        return loop.close();
    }
    nlohmann::json audited(const std::filesystem::path& session) {
        const auto ran = run_millpond("audit " + session.string() + " --json");
        EXPECT_EQ(ran.status, 0) << ran.err;
        return nlohmann::json::parse(ran.out)["controls"];
    }

    const TemporaryFolder temp_, other_; // sessions are named by the second in which they began
    // Before it settles; two that are kept; in a burst from 7000 to 7075; a closed gate; beyond the end.
    const Schedule places_ = at({100, 6200, 7010, 7700, 9500, 60000});
};

TEST_F(PlayedSession, IsToldByTheAuditAndPhantomsComeWherePulsesDid) {
    const auto given = audited(play(Condition::rate_matched, temp_))["scheduled"];
    EXPECT_EQ(given["planned"], 6);
    EXPECT_EQ(given["not_reached"], 1);
    EXPECT_EQ(given["omitted_by"]["gate"], 1);
    EXPECT_GE(given["given"], 2);
    EXPECT_EQ(given["phantom"], 0);
    EXPECT_GE(given["held"], 1) << "the one in the burst waited until it was over";
    EXPECT_EQ(given["given_in_ripples"]["of"], given["given"]);
    const auto phantom = audited(play(Condition::disrupt, other_))["scheduled"];
    EXPECT_EQ(phantom["given"], 0);
    EXPECT_EQ(phantom["phantom"], given["given"]);
    EXPECT_EQ(phantom["omitted_by"], given["omitted_by"]);
    EXPECT_EQ(phantom["held_ms"], given["held_ms"]);
}

TEST_F(PlayedSession, WithoutItsScheduleFileIsAuditedAllTheSame) {
    const auto session = play(Condition::rate_matched, temp_);
    std::filesystem::remove(temp_ / "control.tsv");
    const auto controls = audited(session);
    EXPECT_EQ(controls["scheduled"]["planned"], nullptr);
    EXPECT_NE(controls["about_schedule"].get<std::string>().find("cannot be read"), std::string::npos);
}

// The list said the condition, and it is sealed: given or phantom is what nobody may know yet.
TEST_F(PlayedSession, ThatIsSealedTellsNothingOfItsMoments) {
    AuditInput input;
    input.session = play(Condition::rate_matched, temp_);
    const auto settings = load_settings(input.session / "settings.yaml");
    input.settings = {settings.detector, settings.arbiter};
    input.assignment = SessionAssignment{};
    input.assignment->sealed = true;
    const auto result = audit_session(input);
    write_audit(result, temp_ / "audit", false);
    EXPECT_EQ(read_events_table(temp_ / "audit/schedule.tsv", test_rate.value).size(), 0U);
    EXPECT_EQ(audit_text(result).find("phantom"), std::string::npos);
    EXPECT_EQ(audit_json(result)["controls"], nullptr);
}

} // namespace
} // namespace millpond
