// `millpond feed`: a recording out as RTP at real pace, the stand-in for a rig.
#include "app/commands.hpp"
#include "base/refusal.hpp"
#include "intake/rtp_sender.hpp"
#include "recording/recording_reader.hpp"

#include <CLI/CLI.hpp>
#include <boost/asio/ip/address_v4.hpp>

#include <charconv>
#include <cmath>
#include <csignal>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <memory>

namespace millpond {
namespace {

volatile std::sig_atomic_t interrupted = 0;

struct FeedOptions {
    std::string recording;
    std::string sidecar;
    std::string to = "127.0.0.1:5004";
    std::string encoding = "L16";
    double microvolts_per_count = 0.1;
    double packet_ms = 1.0;
    int payload_type = 96;
    std::string write_sdp;
    double speed = 1.0;
    bool loop = false;
    double from_s = 0.0;
    double duration_s = 0.0;
    bool no_send_time = false;
    std::uint64_t lose_every = 0;
    bool allow_other_hosts = false;
};

void set_destination(const FeedOptions& options, SdpStream& stream) {
    constexpr const char* allowed = "ADDRESS:PORT, a dotted IPv4 address and a port from 1 to 65535";
    const auto colon = options.to.rfind(':');
    const std::string port = colon == std::string::npos ? "" : options.to.substr(colon + 1);
    boost::system::error_code trouble;
    const auto address = boost::asio::ip::make_address_v4(options.to.substr(0, colon).c_str(), trouble);
    const auto [end, bad] = std::from_chars(port.data(), port.data() + port.size(), stream.port);
    if (trouble || bad != std::errc{} || end != port.data() + port.size() || stream.port == 0) {
        throw Refusal("--to", options.to, allowed);
    }
    if (!address.is_loopback() && !options.allow_other_hosts) {
        throw Refusal("--to", options.to,
                      "127.0.0.1:PORT, or --allow-other-hosts where the samples shall leave this computer");
    }
    stream.address = address.to_string();
}

RtpSenderSettings sender_settings(const FeedOptions& options, const RecordingInfo& info) {
    RtpSenderSettings settings;
    set_destination(options, settings.stream);
    settings.stream.payload_type = static_cast<std::uint8_t>(options.payload_type);
    settings.stream.encoding = options.encoding == "L24" ? SampleEncoding::l24 : SampleEncoding::l16;
    const double rate = std::round(info.rate.value);
    if (rate != info.rate.value || rate < 1 || rate > 1e6) {
        throw Refusal(options.recording, std::to_string(info.rate.value) + " frames a second",
                      "a whole number, as SDP needs");
    }
    settings.stream.rate_hz = static_cast<std::uint32_t>(rate);
    settings.stream.channels = info.channels.size();
    settings.stream.send_time_id = options.no_send_time ? 0 : 1;
    settings.microvolts_per_count = static_cast<float>(options.microvolts_per_count);
    settings.frames_per_packet = static_cast<std::uint32_t>(frames_in_ms(options.packet_ms, info.rate));
    settings.lose_every = options.lose_every;
    return settings;
}

void publish_sdp(const FeedOptions& options, const SdpStream& stream) {
    char scale[64];
    std::snprintf(scale, sizeof scale, "%.9g uV per count", options.microvolts_per_count);
    const auto name = std::filesystem::path(options.recording).filename().string();
    const auto text = write_sdp(stream, "millpond feed of " + name, scale);
    if (options.write_sdp.empty()) {
        std::fputs(text.c_str(), stdout);
        std::fflush(stdout);
        return;
    }
    const std::filesystem::path target = options.write_sdp;
    const std::filesystem::path unfinished = options.write_sdp + ".unfinished";
    std::ofstream out(unfinished, std::ios::binary);
    out << text;
    out.close();
    std::error_code trouble;
    if (out) {
        std::filesystem::rename(unfinished, target, trouble);
    }
    if (!out || trouble) {
        std::filesystem::remove(unfinished, trouble);
        throw Refusal("--write-sdp", options.write_sdp, "a file that can be written");
    }
}

/// The stretch of the recording that was asked for, packet by packet, again and again where asked.
class Stretch {
  public:
    explicit Stretch(const FeedOptions& options) : options_(options) { open(); }

    [[nodiscard]] const RecordingInfo& info() const { return reader_->info(); }
    [[nodiscard]] std::uint64_t frames() const { return frames_; }

    /// Empty at the end.
    std::span<const float> next(std::size_t frames_wanted) {
        if (left_ == 0 && options_.loop) {
            open();
        }
        const std::size_t channels = info().channels.size();
        buffer_.resize(frames_wanted * channels);
        const auto wanted = static_cast<std::size_t>(std::min<std::uint64_t>(frames_wanted, left_));
        const std::size_t read = wanted == 0 ? 0 : reader_->read(std::span(buffer_).first(wanted * channels));
        left_ = read < wanted ? 0 : left_ - read;
        return std::span<const float>(buffer_).first(read * channels);
    }

  private:
    void open() {
        reader_ = open_recording(options_.recording, options_.sidecar);
        const std::uint64_t from = frames_in_ms(options_.from_s * 1000.0, info().rate);
        if (from >= info().frames) {
            throw Refusal("--from-s", std::to_string(options_.from_s),
                          "less than the recording's " + std::to_string(seconds_at({info().frames}, info().rate)) +
                              " s");
        }
        skip(from);
        frames_ = info().frames - from;
        if (options_.duration_s > 0.0) {
            frames_ = std::min(frames_, frames_in_ms(options_.duration_s * 1000.0, info().rate));
        }
        left_ = frames_;
    }

    void skip(std::uint64_t frames) {
        const std::size_t channels = info().channels.size();
        buffer_.resize(4096 * channels);
        while (frames > 0) {
            const auto wanted = static_cast<std::size_t>(std::min<std::uint64_t>(frames, 4096));
            const std::size_t read = reader_->read(std::span(buffer_).first(wanted * channels));
            frames = read < wanted ? 0 : frames - read;
        }
    }

    const FeedOptions& options_;
    std::unique_ptr<RecordingReader> reader_;
    std::vector<float> buffer_;
    std::uint64_t frames_ = 0;
    std::uint64_t left_ = 0;
};

void report(const RtpSenderCounts& counts, const FeedOptions& options, Hertz rate, Nanos most_late) {
    std::printf("sent %llu frames (%.3f s) in %llu packets; latest %.3f ms behind its time\n",
                static_cast<unsigned long long>(counts.frames), seconds_at({counts.frames}, rate),
                static_cast<unsigned long long>(counts.packets), static_cast<double>(most_late.count()) * 1e-6);
    if (counts.left_out > 0) {
        std::printf("left out %llu packets, as --lose-every asked\n", static_cast<unsigned long long>(counts.left_out));
    }
    if (counts.refused > 0) {
        std::printf("%llu packets were not taken: nobody listened at %s\n",
                    static_cast<unsigned long long>(counts.refused), options.to.c_str());
    }
    if (counts.losses.clipped > 0) {
        std::printf("clipped %llu samples beyond the range of %s at %g uV per count: raise --microvolts-per-count\n",
                    static_cast<unsigned long long>(counts.losses.clipped), options.encoding.c_str(),
                    options.microvolts_per_count);
    }
    if (counts.losses.non_finite > 0) {
        std::printf("sent 0 in place of %llu samples that are no number\n",
                    static_cast<unsigned long long>(counts.losses.non_finite));
    }
}

void send_all(Stretch& stretch, RtpSender& sender, Pace& pace, std::uint32_t frames_per_packet) {
    const Hertz rate = stretch.info().rate;
    std::uint64_t tell_at = 0;
    while (interrupted == 0) {
        const auto frames = stretch.next(frames_per_packet);
        // A packet is due when the last of its samples would have been taken.
        const std::uint64_t end = sender.counts().frames + frames.size() / stretch.info().channels.size();
        if (frames.empty() || !pace.wait_for(end)) {
            break;
        }
        sender.send(frames);
        if (end >= tell_at) {
            std::fprintf(stderr, "\rfeed: %.0f s of %.0f s sent ", seconds_at({end}, rate),
                         seconds_at({stretch.frames()}, rate));
            tell_at = end + static_cast<std::uint64_t>(rate.value);
        }
    }
    std::fputs("\n", stderr);
}

void feed(const FeedOptions& options) {
    struct sigaction on_interrupt {};
    on_interrupt.sa_handler = [](int) { interrupted = 1; };
    sigaction(SIGINT, &on_interrupt, nullptr);
    sigaction(SIGTERM, &on_interrupt, nullptr);
    Stretch stretch(options);
    const auto settings = sender_settings(options, stretch.info());
    RtpSender sender(settings);
    publish_sdp(options, settings.stream);
    Pace pace(stretch.info().rate, options.speed);
    send_all(stretch, sender, pace, settings.frames_per_packet);
    report(sender.counts(), options, stretch.info().rate, pace.most_late());
}

} // namespace

void add_feed_command(CLI::App& program) {
    auto options = std::make_shared<FeedOptions>();
    auto* feed_app = program.add_subcommand("feed", "Send a recording as RTP at real pace: the stand-in for a rig.");
    feed_app->add_option("RECORDING", options->recording, "recording to send")->required();
    feed_app->add_option("--sidecar", options->sidecar,
                         "YAML file with scale, names and rates that the recording does not say");
    feed_app->add_option("--to", options->to, "IPv4 address and UDP port to send to")->capture_default_str();
    feed_app->add_option("--encoding", options->encoding, "how samples are sent")
        ->check(CLI::IsMember({"L16", "L24"}))
        ->capture_default_str();
    feed_app
        ->add_option("--microvolts-per-count", options->microvolts_per_count, "what one count of the integers is worth")
        ->check(CLI::Range(1e-6, 1e6))
        ->capture_default_str();
    feed_app->add_option("--packet-ms", options->packet_ms, "length of a packet; at least one frame")
        ->check(CLI::Range(0.001, 1000.0))
        ->capture_default_str();
    feed_app->add_option("--payload-type", options->payload_type, "RTP payload type (dynamic)")
        ->check(CLI::Range(96, 127))
        ->capture_default_str();
    feed_app->add_option("--write-sdp", options->write_sdp, "file for the stream's description; else it is printed");
    feed_app->add_option("--speed", options->speed, "pace, 1 is real")
        ->check(CLI::Range(0.01, 1000.0))
        ->capture_default_str();
    feed_app->add_flag("--loop", options->loop, "begin again at the end, until interrupted");
    feed_app->add_option("--from-s", options->from_s, "where in the recording to begin")->check(CLI::Range(0.0, 1e9));
    feed_app->add_option("--duration-s", options->duration_s, "how much of it to send; 0: all that follows")
        ->check(CLI::Range(0.0, 1e9));
    feed_app->add_flag("--no-send-time", options->no_send_time, "do not stamp packets with the moment of sending");
    feed_app->add_option("--lose-every", options->lose_every, "leave out every so manyth packet, for drills; 0: none");
    feed_app->add_flag("--allow-other-hosts", options->allow_other_hosts, "allow an address outside this computer");
    add_example(*feed_app, "build/millpond feed replay_files/four_sites_90s.flac --to 127.0.0.1:5004 "
                           "--microvolts-per-count 0.2 --write-sdp rig.sdp");
    feed_app->callback([options] { feed(*options); });
}

} // namespace millpond
