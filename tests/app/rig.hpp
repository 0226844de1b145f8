// A rig for end-to-end tests: an invented recording, settings, and the built program's commands as child processes.
#pragma once

#include "journal/session_reader.hpp"
#include "support/files.hpp"
#include "support/process.hpp"
#include "support/text.hpp"
#include "support/udp_port.hpp"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <map>
#include <optional>
#include <string>

namespace millpond::test {

/// What a test wants to differ from the rest; all else is fixed in `Rig::settings`.
struct RigSettings {
    std::string stream;            ///< lines under `stream:`; empty: RTP L16 of 5 channels as `feed` sends it
    std::string channels;          ///< lines under `channels:`; empty: four ripple sites and a reference
    std::string output = "silent"; ///< or osc
    std::string more_outputs;      ///< lines under `outputs:`
    double width_ms = 1.0;
    double longest_high_ms = 5000.0; ///< a busy machine must not look like a line that hangs
    double lockout_ms = 500.0;       ///< long against a pulse even at several times real pace
    bool armed = true;
    bool control = false;
    std::string secret;
    double stale_after_ms = 5000.0; ///< a busy machine must not look like a silent sender
    double min_free_mb = 1.0;
    std::string folder = "sessions";
    std::string more; ///< further sections, as they stand in the file
};

class Rig {
  public:
    static constexpr int channels = 5;
    static constexpr double rate_hz = 1250.0;

    [[nodiscard]] std::filesystem::path operator/(const std::string& name) const { return scratch_ / name; }
    [[nodiscard]] std::string path(const std::string& name) const { return (scratch_ / name).string(); }
    [[nodiscard]] int port() const { return port_; }
    [[nodiscard]] int pulse_port() const { return pulse_port_; }
    [[nodiscard]] int control_port() const { return control_port_; }
    [[nodiscard]] std::string address() const { return "127.0.0.1:" + std::to_string(port_); }

    [[nodiscard]] std::unique_ptr<Process> start(std::vector<std::string> words, Process::Options options = {}) {
        return std::make_unique<Process>(std::move(words), log("started"), std::move(options));
    }

    /// An invented 16-bit recording, 0.2 uV per count, ripples from the third second on.
    std::string recording(double duration_s, const std::string& name = "invented.wav") {
        const auto made =
            run_millpond("synth " + path(name) + " --duration-s " + std::to_string(duration_s) +
                         " --sites 4 --reference --rate-hz 1250 --quiet-start-s 3 --ripples-rate-per-s 1.5"
                         " --microvolts-per-count 0.2 --seed 7");
        EXPECT_EQ(made.status, 0) << made.err;
        return path(name);
    }

    std::string settings(const RigSettings& want, const std::string& name = "rig.yaml") {
        std::string text = "stream:\n";
        text += want.stream.empty() ? "  source: rtp\n  port: " + std::to_string(port_) +
                                          "\n  encoding: L16\n  rate_hz: 1250\n  channels: 5\n"
                                          "  microvolts_per_count: 0.2\n  send_time_extension: 1\n"
                                    : want.stream;
        text += "  stale_after_ms: " + std::to_string(want.stale_after_ms) + "\nchannels:\n";
        text += want.channels.empty() ? "  - {name: CA1-1, role: ripple}\n  - {name: CA1-2, role: ripple}\n"
                                        "  - {name: CA1-3, role: ripple}\n  - {name: CA1-4, role: ripple}\n"
                                        "  - {name: cortex, role: reference}\n"
                                      : want.channels;
        text += "detector:\n  floor: {time_constant_s: 5, settle_s: 1}\n";
        text += "arbiter:\n  start_armed: " + std::string(want.armed ? "true" : "false") +
                "\n  seed: 7\n  lockout_ms: " + std::to_string(want.lockout_ms) +
                "\n  gates:\n    - {name: immobile, starts_open: true}\n";
        text += "outputs:\n  - {name: pulse, kind: " + want.output + ", port: " + std::to_string(pulse_port_) +
                ", width_ms: " + std::to_string(want.width_ms) +
                ", longest_high_ms: " + std::to_string(want.longest_high_ms) + "}\n" + want.more_outputs;
        text += "control: {listen: " + std::string(want.control ? "true" : "false") +
                ", port: " + std::to_string(control_port_) + ", secret: '" + want.secret + "'}\n";
        text += "session: {folder: " + want.folder +
                ", name: rig, store_samples: rf64, min_free_mb: " + std::to_string(want.min_free_mb) + "}\n" +
                want.more;
        return scratch_.file(name, text).string();
    }

    /// `live`, started and listening.
    [[nodiscard]] std::unique_ptr<Process> live(const std::string& settings_file, Process::Options options = {}) {
        auto session = start({MILLPOND_PROGRAM, "live", settings_file, "--status-every-s", "0.2"}, std::move(options));
        EXPECT_TRUE(session->says("session folder ")) << session->err();
        return session;
    }
    [[nodiscard]] std::unique_ptr<Process> feed(const std::string& recording_file, std::vector<std::string> more = {}) {
        std::vector<std::string> words{MILLPOND_PROGRAM,         "feed", recording_file, "--to", address(),
                                       "--microvolts-per-count", "0.2",  "--packet-ms",  "4",    "--write-sdp",
                                       path("feed.sdp")};
        words.insert(words.end(), more.begin(), more.end());
        return start(words);
    }
    /// liblo's receiver, with a line out at once for each message.
    [[nodiscard]] std::unique_ptr<Process> oscdump() {
        auto dump = start({"oscdump", "-L", std::to_string(pulse_port_)});
        EXPECT_TRUE(wait_until([this] { return udp_port_taken(pulse_port_); })) << dump->err();
        return dump;
    }

    /// The folder that a session named on standard error.
    static std::filesystem::path folder_of(const Process& session) {
        for (const auto& line : lines_of(session.err())) {
            if (const auto at = line.find("session folder "); at != std::string::npos) {
                return line.substr(at + std::string("session folder ").size());
            }
        }
        return {};
    }
    /// Frames that the session has on its disk so far.
    static std::uint64_t frames_stored(const std::filesystem::path& session) {
        try {
            const auto samples = SessionReader(session).open_samples();
            return samples ? samples->frames() : 0;
        } catch (const std::exception&) {
            return 0; // between two writes
        }
    }

    /// What a session over a whole recording left, and what it showed on the terminal.
    struct Played {
        std::filesystem::path folder;
        std::string shown;
    };
    /// A session with `words` as its command line, streamed at eight times real pace to its last frame and ended by
    /// Ctrl-C.
    Played play(std::vector<std::string> words, const std::string& recording_file, std::uint64_t frames) {
        const auto session = start(std::move(words));
        EXPECT_TRUE(session->says("session folder ")) << session->err();
        const auto folder = folder_of(*session);
        EXPECT_EQ(feed(recording_file, {"--speed", "8"})->status(), 0);
        EXPECT_TRUE(wait_until([&] { return frames_stored(folder) >= frames; }));
        session->send(SIGINT);
        EXPECT_EQ(session->status(), 0) << session->err();
        return {folder, session->out() + session->err()};
    }

    nlohmann::json audit(const std::filesystem::path& session, int expected_status = 0) {
        const auto ran = run_millpond("audit " + session.string() + " --json");
        EXPECT_EQ(ran.status, expected_status) << ran.err << ran.out.substr(0, 2000);
        return ran.out.empty() ? nlohmann::json::object() : nlohmann::json::parse(ran.out);
    }

  private:
    std::filesystem::path log(const std::string& name) { return scratch_ / (name + std::to_string(++logs_)); }

    TemporaryFolder scratch_;
    int port_ = free_udp_port(), pulse_port_ = free_udp_port(), control_port_ = free_udp_port();
    int logs_ = 0;
};

using Row = std::map<std::string, std::string>;

/// A tab-separated table, each row by column name.
inline std::vector<Row> rows_of(const std::filesystem::path& table, const std::string& trial_type) {
    const auto cells_of = [](const std::string& line) {
        std::vector<std::string> cells;
        std::istringstream in(line);
        for (std::string cell; std::getline(in, cell, '\t');) {
            cells.push_back(cell);
        }
        return cells;
    };
    std::vector<Row> rows;
    std::vector<std::string> names;
    for (const auto& line : lines_of(text_of(table))) {
        const auto cells = cells_of(line);
        if (names.empty()) {
            names = cells;
            continue;
        }
        Row row;
        for (std::size_t i = 0; i < std::min(names.size(), cells.size()); ++i) {
            row[names[i]] = cells[i];
        }
        if (row["trial_type"] == trial_type) {
            rows.push_back(std::move(row));
        }
    }
    return rows;
}

} // namespace millpond::test
