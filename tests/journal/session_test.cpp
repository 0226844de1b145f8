#include "base/refusal.hpp"
#include "journal/session_folder.hpp"
#include "journal/session_reader.hpp"
#include "journal/session_support.hpp"
#include "journal/session_writer.hpp"
#include "recording/events_table.hpp"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <cmath>
#include <cstring>
#include <thread>

namespace millpond {
namespace {

using namespace test;

Event detection_at(std::uint64_t sample) {
    return Event::make(EventKind::detection, 0, SampleIndex{sample}, DetectionDetail{90, 20, 10, 60, 2, 1});
}

Event withheld_at(std::uint64_t sample, Rule rule) {
    return Event::make(EventKind::withheld, static_cast<std::uint8_t>(rule), SampleIndex{sample}, CountDetail{0});
}

template <class Detail> std::vector<Detail> details_of(const SessionReader& session, EventKind kind) {
    std::vector<Detail> found;
    for (const auto& event : session.events()) {
        if (event.kind == kind) {
            found.push_back(event.as<Detail>());
        }
    }
    return found;
}

TEST(Session, ClosedSessionHasFirstAndLastEventTablesAndProvenance) {
    const TemporaryFolder temp;
    auto about = about_stream();
    about.channels[1].role = ChannelRole::reference;
    about.warm_start = {{12.345678901234567, 3.1, 0.0F, 0, 0, 77}};
    about.more = {{"port", 5004}};
    about.settings_text = "stream:\n  port: 5004\n";
    auto writer = SessionWriter::open(session_in(temp), about);
    writer->loop_sink().take(detection_at(500));
    writer->loop_sink().take(
        Event::make(EventKind::trigger, 0, SampleIndex{500}, TriggerDetail{500, 1, PulseOrigin::trigger, 0, 0}));
    writer->pulse_sink().take(Event::make(EventKind::pulse, 0, SampleIndex{500},
                                          PulseDetail{1000, PulseDetail::not_measured, 2000, 3000, 4000}));
    writer->pulse_sink().take(Event::make(EventKind::pulse_end, 0, SampleIndex{500}, PulseEndDetail{5'000'000, 100}));
    writer->loop_sink().take(withheld_at(900, Rule::lock_out));
    writer->close(SampleIndex{1250});

    const SessionReader session(writer->folder());
    EXPECT_FALSE(session.cut());
    EXPECT_EQ(session.end(), SampleIndex{1250});
    EXPECT_TRUE(session.damage().empty());
    EXPECT_EQ(session.events().front().kind, EventKind::session_start);
    EXPECT_EQ(session.events().back().kind, EventKind::session_end);
    EXPECT_EQ(text_of(session.settings_file()), about.settings_text);
    const auto& read = session.provenance().about;
    EXPECT_EQ(read.channels, about.channels);
    EXPECT_EQ(read.warm_start.at(0).mean, 12.345678901234567);
    EXPECT_EQ(read.more, about.more);
    EXPECT_FALSE(session.provenance().kernel.empty());

    const auto rows = read_events_table(session.folder() / "events.tsv", 1250.0);
    ASSERT_EQ(rows.size(), 4U);
    EXPECT_EQ(rows[0].trial_type, "detection");
    EXPECT_EQ(rows[0].sample, 500);
    EXPECT_DOUBLE_EQ(rows[0].onset_s, 0.4);
    EXPECT_EQ(rows[2].trial_type, "pulse");
    EXPECT_DOUBLE_EQ(rows[2].duration_s, 0.005);
    EXPECT_EQ(rows[2].extra.count("transport_us"), 0U) << "not measured is never a number";
    EXPECT_EQ(rows[3].extra.at("rule"), "lock-out");
    const auto dictionary = nlohmann::json::parse(text_of(session.folder() / "events.json"));
    EXPECT_TRUE(dictionary.contains("rule"));
}

TEST(Session, SequenceNumbersFollowTheWrittenOrderAndCausesComeBeforeEffects) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp), about_stream());
    for (std::uint64_t i = 0; i < 200; ++i) {
        writer->loop_sink().take(detection_at(i));
        writer->pulse_sink().take(Event::make(EventKind::pulse, 0, SampleIndex{i}, PulseDetail{}));
    }
    writer->close(SampleIndex{200});
    const SessionReader session(writer->folder());
    std::uint64_t detections = 0;
    for (std::size_t i = 0; i < session.events().size(); ++i) {
        const auto& event = session.events()[i];
        EXPECT_EQ(event.sequence, i);
        detections += event.kind == EventKind::detection ? 1 : 0;
        EXPECT_TRUE(event.kind != EventKind::pulse || event.sample.value < detections);
    }
}

TEST(Session, UnclosedSessionReadsAsCut) {
    const TemporaryFolder temp;
    std::filesystem::path folder;
    {
        auto writer = SessionWriter::open(session_in(temp), about_stream());
        writer->loop_sink().take(detection_at(321));
        folder = writer->folder();
    }
    const SessionReader session(folder);
    EXPECT_TRUE(session.cut());
    EXPECT_EQ(session.end(), SampleIndex{321});
    EXPECT_FALSE(std::filesystem::exists(folder / "events.tsv"));
}

TEST(Session, PacketTimingsComeBackAsTheSameHistogram) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp), about_stream());
    LatencyHistogram wanted;
    for (std::int64_t i = 0; i < 5000; ++i) {
        const auto ns = 1000 + i * i % 90'000;
        wanted.add(ns);
        writer->time_packet({PulseDetail::not_measured, ns, 2 * ns});
    }
    writer->close(SampleIndex{1});
    LatencyHistogram wake;
    std::uint64_t transport_events = 0;
    const SessionReader session(writer->folder());
    for (const auto& event : session.events()) {
        if (event.kind == EventKind::latency_bins && event.code == static_cast<std::uint8_t>(LatencyPart::wake)) {
            for (const auto& bin : event.as<LatencyBins>().bins) {
                wake.add_bin(bin.bin, bin.count);
            }
        }
        transport_events +=
            event.kind == EventKind::latency_bins && event.code == static_cast<std::uint8_t>(LatencyPart::transport);
    }
    EXPECT_EQ(wake.count(), 5000U);
    for (const auto q : {0.5, 0.9, 0.99, 0.999}) {
        EXPECT_EQ(wake.quantile_ns(q), wanted.quantile_ns(q));
    }
    EXPECT_EQ(transport_events, 0U) << "transport was not measured";
}

TEST(Session, SnapshotCountsWhatTheRingsCarried) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp), about_stream());
    writer->loop_sink().take(detection_at(10));
    writer->loop_sink().take(withheld_at(10, Rule::veto));
    writer->loop_sink().take(Event::make(EventKind::gap, 1, SampleIndex{20}, GapDetail{7}));
    writer->loop_sink().take(Event::make(EventKind::floor, 0, SampleIndex{30}, FloorDetail{20, 5, 40, 1, 1, 9}));
    writer->loop_sink().take(Event::make(EventKind::state, 1, SampleIndex{31}, StateDetail{0, 1}));
    writer->time_packet({PulseDetail::not_measured, 1000, 63});
    writer->close(SampleIndex{40});
    const auto figures = writer->snapshot();
    EXPECT_EQ(figures.detections, 1U);
    EXPECT_EQ(figures.withheld[static_cast<std::size_t>(Rule::veto)], 1U);
    EXPECT_EQ(figures.gaps, 1U);
    EXPECT_EQ(figures.frames_missing, 7U);
    ASSERT_EQ(figures.floors.size(), 1U);
    EXPECT_EQ(figures.floors[0].mean, 20.0);
    EXPECT_EQ(figures.state, ArmState::armed);
    EXPECT_EQ(figures.loop_p50_ns, 63);
    EXPECT_EQ(figures.trouble, "");
}

TEST(Session, FullRingIsCountedJournaledAndTold) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp), about_stream());
    constexpr std::uint64_t count = 200'000; // three times the ring, faster than any drain
    for (std::uint64_t i = 0; i < count; ++i) {
        writer->loop_sink().take(detection_at(i));
    }
    const auto dropped = writer->loop_sink().dropped();
    writer->close(SampleIndex{count});
    if (dropped == 0) {
        GTEST_SKIP() << "THE DRAIN KEPT UP WITH " << count << " EVENTS IN ONE GO: nothing was dropped, nothing to see";
    }
    const SessionReader session(writer->folder());
    std::uint64_t told = 0;
    for (const auto& event : session.events()) {
        if (event.kind == EventKind::dropped && event.code == static_cast<std::uint8_t>(Dropped::events)) {
            told += event.as<CountDetail>().count;
        }
    }
    EXPECT_EQ(told, dropped);
    EXPECT_EQ(details_of<DetectionDetail>(session, EventKind::detection).size() + dropped, count);
    EXPECT_EQ(writer->trouble(), JournalTrouble::fell_behind);
    EXPECT_EQ(writer->snapshot().events_dropped, dropped);
}

TEST(Session, LongNoteIsPutTogetherAgain) {
    const auto part = [](std::string_view text, bool continues) {
        NoteDetail detail{};
        detail.length = static_cast<std::uint8_t>(text.size());
        detail.continues = continues ? 1 : 0;
        std::memcpy(detail.text.data(), text.data(), text.size());
        return Event::make(EventKind::note, 0, SampleIndex{5}, detail);
    };
    const std::vector<Event> events{part("the animal falls ", true), part("asleep", false), part("moved", false)};
    const auto notes = notes_in(events);
    ASSERT_EQ(notes.size(), 2U);
    EXPECT_EQ(notes[0].text, "the animal falls asleep");
    EXPECT_EQ(notes[1].text, "moved");
}

TEST(SessionFolder, ASessionThatExistsIsNeverOverwritten) {
    const TemporaryFolder temp;
    const auto settings = session_in(temp);
    const std::int64_t start = 1'772'357'400'000'000'000; // 2026-03-01 09:30:00 UTC, by date(1)
    {
        NewSessionFolder first(settings, start);
        first.write_text("settings.yaml", "mine\n");
        EXPECT_EQ(first.commit().filename(), "20260301T093000Z_test");
    }
    EXPECT_THROW(NewSessionFolder(settings, start), Refusal);
    EXPECT_EQ(text_of(temp.path() / "20260301T093000Z_test" / "settings.yaml"), "mine\n");
}

TEST(SessionFolder, AFolderThatAppearsMeanwhileIsNotReplacedEvenIfEmpty) {
    const TemporaryFolder temp;
    NewSessionFolder late(session_in(temp), 1'772'357'400'000'000'000);
    std::filesystem::create_directory(temp.path() / "20260301T093000Z_test");
    EXPECT_THROW(late.commit(), Refusal);
}

TEST(SessionFolder, NothingStaysOfAFolderThatWasNeverCommitted) {
    const TemporaryFolder temp;
    { const NewSessionFolder unfinished(session_in(temp), 1'772'357'400'000'000'000); }
    EXPECT_TRUE(std::filesystem::is_empty(temp.path()));
}

TEST(SessionFolder, NameThatWouldLeaveTheFolderIsRefused) {
    const TemporaryFolder temp;
    auto settings = session_in(temp);
    settings.name = "../elsewhere";
    EXPECT_THROW(SessionWriter::open(settings, about_stream()), Refusal);
}

TEST(SessionFolder, DiskWithLessThanTheMinimumIsRefused) {
    const TemporaryFolder temp;
    auto settings = session_in(temp);
    settings.min_free_mb = 1e9;
    EXPECT_THROW(SessionWriter::open(settings, about_stream()), Refusal);
}

TEST(SessionReader, CutSessionEndsWhereTheEngineLastSpoke) {
    const TemporaryFolder temp;
    std::filesystem::path folder;
    {
        auto writer = SessionWriter::open(session_in(temp, StoreSamples::rf64), about_stream());
        writer->loop_sink().take(detection_at(40));
        writer->store({SampleIndex{0}, 2, std::vector<float>(200, 1.0F)});
        writer->time_packet({1, 2, 3});
        std::this_thread::sleep_for(
            std::chrono::milliseconds{150}); // latencies are told, at the end of the stored block
        folder = writer->folder();
    }
    EXPECT_EQ(SessionReader(folder).end(), SampleIndex{40});
}

TEST(SessionReader, ProvenanceWithoutARateIsRefused) {
    const TemporaryFolder temp;
    auto writer = SessionWriter::open(session_in(temp), about_stream());
    writer->close(SampleIndex{1});
    auto json = nlohmann::json::parse(text_of(writer->folder() / "provenance.json"));
    json["rate_hz"] = 0;
    std::ofstream(writer->folder() / "provenance.json") << json;
    EXPECT_THROW(SessionReader{writer->folder()}, Refusal);
}

TEST(SessionReader, DryRunOutputIsRefusedAndSaysWhatItIs) {
    const TemporaryFolder temp;
    std::ofstream(temp.path() / "score.json") << "{}";
    try {
        const SessionReader session(temp.path());
        FAIL();
    } catch (const Refusal& refusal) {
        EXPECT_NE(std::strstr(refusal.what(), "dry run"), nullptr);
    }
}

TEST(LastFloors, TakeThoseOfOpenGatesBeforeNewerOnesOfClosedGates) {
    const auto floor = [](std::uint64_t at, double mean, std::uint16_t site, std::uint64_t closed) {
        return Event::make(EventKind::floor, 0, SampleIndex{at}, FloorDetail{mean, 1.0, 3.0F, site, 1, at, closed});
    };
    const std::vector<Event> events{floor(1, 10.0, 0, 0), floor(2, 11.0, 0, 0), floor(3, 90.0, 0, 1),
                                    floor(2, 80.0, 1, 1), floor(3, 81.0, 1, 1)};
    const auto floors = last_floors(events);
    ASSERT_EQ(floors.size(), 2U);
    EXPECT_EQ(floors[0].mean, 11.0);
    EXPECT_EQ(floors[1].mean, 81.0) << "never open: the newest there is";
}

} // namespace
} // namespace millpond
