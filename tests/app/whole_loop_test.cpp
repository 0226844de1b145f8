// The whole arrow from end to end: samples from programs that nobody here wrote, pulses to one, and the audit of it
// all.
#include "app/rig.hpp"

namespace millpond::testing {
namespace {

// Checked against: ffmpeg as sender (RTP, RFC 3550; L16, RFC 3551; SDP, RFC 8866), liblo's oscdump as receiver
// (OSC 1.0).
#define NEEDS(program)                                                                                                 \
    if (!has_program(program)) {                                                                                       \
        GTEST_SKIP() << "SKIPPED LOUDLY: no " program " on this computer, nothing was checked against it";             \
    }                                                                                                                  \
    static_cast<void>(0)

constexpr double seconds_of_signal = 20.0;
constexpr std::uint64_t frames_of_signal = 25000;

/// `1` and `0` in the order in which oscdump printed them.
std::string line_levels(const Process& dump) {
    std::string levels;
    for (const auto& line : lines_of(dump.out())) {
        if (const auto at = line.find("/line i "); at != std::string::npos) {
            levels += line.at(at + 8);
        }
    }
    return levels;
}

/// Every high is followed by its low; there are as many as the session has pulses.
void expect_one_high_and_one_low_each(const std::string& levels, std::size_t pulses) {
    EXPECT_EQ(count_in(levels, "1"), pulses) << levels;
    EXPECT_EQ(count_in(levels, "10"), pulses) << levels;
    EXPECT_EQ(levels.empty() ? '0' : levels.back(), '0') << levels;
}

void expect_all_frames(const std::filesystem::path& session, std::uint64_t frames) {
    EXPECT_TRUE(wait_until([&] { return Rig::frames_stored(session) >= frames; })) << Rig::frames_stored(session);
    EXPECT_EQ(Rig::frames_stored(session), frames);
}

void expect_good_end(Process& session) {
    session.send(SIGINT);
    EXPECT_EQ(session.status(), 0) << session.err();
}

/// ffmpeg's arguments: `input` as L16 to the rig's port.
std::vector<std::string> ffmpeg_to(const Rig& rig, const std::string& input, const std::vector<std::string>& more) {
    std::vector<std::string> words{"ffmpeg", "-hide_banner", "-loglevel", "error", "-nostdin", "-readrate",
                                   "8",      "-i",           input};
    words.insert(words.end(), more.begin(), more.end());
    for (const std::string word : {"-c:a", "pcm_s16be", "-f", "rtp", "-sdp_file"}) {
        words.push_back(word);
    }
    words.push_back(rig.path("rig.sdp"));
    words.push_back("rtp://" + rig.address());
    return words;
}

/// Streams `input` from ffmpeg to a session made from ffmpeg's own description; returns the audit.
nlohmann::json stream_by_ffmpeg(Rig& rig, const std::string& input, const std::vector<std::string>& filter,
                                RigSettings want, std::uint64_t frames) {
    auto description_only = ffmpeg_to(rig, input, {"-t", "0.01"});
    EXPECT_EQ(rig.start(description_only)->status(), 0);
    const auto dump = rig.oscdump();
    want.output = "osc";
    const auto session = rig.live(rig.settings(want));
    const auto sender = rig.start(ffmpeg_to(rig, input, filter));
    expect_all_frames(Rig::folder_of(*session), frames);
    EXPECT_EQ(sender->status(), 0) << sender->err();
    expect_good_end(*session);
    const auto audit = rig.audit(Rig::folder_of(*session));
    const auto pulses = audit.at("decisions").at("pulses").get<std::size_t>();
    EXPECT_TRUE(wait_until([&] { return count_in(line_levels(*dump), "10") >= pulses; }));
    expect_one_high_and_one_low_each(line_levels(*dump), pulses);
    EXPECT_EQ(audit.at("decisions").at("pulse_ends"), pulses);
    EXPECT_TRUE(audit.at("rerun").at("done"));
    EXPECT_TRUE(audit.at("rerun").at("reproduced"));
    EXPECT_EQ(audit.at("stream").at("frames_missing"), 0);
    return audit;
}

TEST(FfmpegToLiveToOscdump, EveryPulseArrivesOnceHighAndOnceLowAndTheAuditReproducesIt) {
    NEEDS("ffmpeg");
    NEEDS("oscdump");
    Rig rig;
    RigSettings want;
    want.stream = "  sdp_file: rig.sdp\n  microvolts_per_count: 0.2\n";
    const auto audit = stream_by_ffmpeg(rig, rig.recording(seconds_of_signal), {}, want, frames_of_signal);
    EXPECT_GE(audit.at("decisions").at("pulses"), 5) << "ripples at 1.5 a second for 17 s";
}

// A real local field potential. The animal is in theta, so whatever is found is most likely false: what is checked is
// that every sample and every pulse comes through.
TEST(FfmpegToLiveToOscdump, ARealRecordingComesThroughWhole) {
    NEEDS("ffmpeg");
    NEEDS("oscdump");
    if (outside_recordings().empty()) {
        GTEST_SKIP() << "SKIPPED LOUDLY: MILLPOND_RECORDINGS names no folder, no real recording was streamed";
    }
    Rig rig;
    RigSettings want;
    want.stream = "  sdp_file: rig.sdp\n  microvolts_per_count: 0.1\n";
    want.channels = "  - {name: CA1, role: ripple}\n  - {name: EC3, role: reference}\n";
    // The file holds microvolts as floats, ffmpeg takes 1.0 as full scale: ten counts a microvolt are 10 / 32768.
    const std::vector<std::string> filter{"-af", "volume=0.00030517578125:precision=float"};
    stream_by_ffmpeg(rig, (outside_recordings() / "rat_hippocampus_60s.wav").string(), filter, want, 75000);
}

std::vector<Row> only(std::vector<Row> rows, const std::vector<std::string>& columns) {
    for (auto& row : rows) {
        Row kept;
        for (const auto& column : columns) {
            kept[column] = row.count(column) > 0 ? row[column] : "no such column";
        }
        row = kept;
    }
    return rows;
}

/// Detections, triggers and withheld of two events tables are the same to the last figure.
void expect_same_decisions(const std::filesystem::path& dry, const std::filesystem::path& live) {
    for (const auto& [kind, columns] : std::map<std::string, std::vector<std::string>>{
             {"detection", {"onset", "sample", "envelope_uv", "floor_uv", "threshold_uv", "site", "votes"}},
             {"trigger", {"onset", "sample", "number"}},
             {"withheld", {"onset", "sample", "rule"}}}) {
        EXPECT_EQ(only(rows_of(dry, kind), columns), only(rows_of(live, kind), columns)) << kind;
    }
    EXPECT_GE(rows_of(dry, "detection").size(), 5U);
    EXPECT_GE(rows_of(dry, "trigger").size(), 5U);
}

std::filesystem::path dry_run(Rig& rig, const std::string& recording, const std::string& settings) {
    const auto dry = rig.millpond("dryrun " + recording + " --settings " + settings + " --out " + rig.path("dry"));
    EXPECT_EQ(dry.status, 0) << dry.err;
    return rig / "dry" / "events.tsv";
}

TEST(DryRunThenLive, SameSamplesBySoftwareAndByNetworkGiveTheSameDecisions) {
    Rig rig;
    const auto recording = rig.recording(seconds_of_signal);
    const auto settings = rig.settings({});
    const auto dry = dry_run(rig, recording, settings);
    const auto session = rig.live(settings);
    EXPECT_EQ(rig.feed(recording, {"--speed", "8"})->status(), 0);
    expect_all_frames(Rig::folder_of(*session), frames_of_signal);
    expect_good_end(*session);
    const auto audit = rig.audit(Rig::folder_of(*session));
    EXPECT_TRUE(audit.at("rerun").at("reproduced"));
    EXPECT_FALSE(audit.at("cut"));
    EXPECT_EQ(audit.at("stream").at("frames_missing"), 0);
    expect_same_decisions(dry, Rig::folder_of(*session) / "events.tsv");
}

/// A pipe of raw frames that ffmpeg makes of a recording, into a session that ends with it.
void pipe_and_compare(Rig& rig, const std::string& recording, const std::string& format, const std::string& stream) {
    RigSettings want;
    want.stream = "  source: pipe\n  rate_hz: 1250\n  channels: 5\n" + stream;
    const auto settings = rig.settings(want);
    const auto dry = dry_run(rig, recording, settings);
    const auto ran = rig.shell("ffmpeg -hide_banner -loglevel error -nostdin -readrate 8 -i " + recording + " -f " + format +
                               " - | " + MILLPOND_PROGRAM + " live " + settings);
    EXPECT_EQ(ran.status, 0) << ran.err;
    std::filesystem::path session;
    for (const auto& entry : std::filesystem::directory_iterator(rig / "sessions")) {
        session = entry.path();
    }
    EXPECT_EQ(Rig::frames_stored(session), frames_of_signal);
    EXPECT_TRUE(rig.audit(session).at("rerun").at("reproduced"));
    expect_same_decisions(dry, session / "events.tsv");
}

TEST(FfmpegPipedIntoLive, FloatFramesGiveTheDecisionsOfADryRunOfTheSameFile) {
    NEEDS("ffmpeg");
    Rig rig;
    const auto made = rig.millpond("synth " + rig.path("float.wav") + " --duration-s 20 --sites 4 --reference " +
                                   "--quiet-start-s 3 --ripples-rate-per-s 1.5 --encoding float32 --seed 7");
    ASSERT_EQ(made.status, 0) << made.err;
    pipe_and_compare(rig, rig.path("float.wav"), "f32le", "  encoding: float32\n");
}

TEST(FfmpegPipedIntoLive, SixteenBitFramesGiveTheDecisionsOfADryRunOfTheSameFile) {
    NEEDS("ffmpeg");
    Rig rig;
    pipe_and_compare(rig, rig.recording(seconds_of_signal), "s16le",
                     "  encoding: int16\n  microvolts_per_count: 0.2\n");
}

} // namespace
} // namespace millpond::testing
