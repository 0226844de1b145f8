// Packet sent to pulse order received over loopback, against a bare UDP receive-and-send loop in the same run.
// Usage: loop_bench [ROUNDS] [SECONDS_A_ROUND]   ours and the bare loop take turns; prints p50, p99, p99.9, max, count.
// The whole session runs: RTP in, engine, OSC out, every event and sample journaled to disk.
#include "engine/engine.hpp"
#include "intake/open_source.hpp"
#include "intake/rtp_packet.hpp"
#include "intake/rtp_sender.hpp"
#include "journal/session_writer.hpp"
#include "live/live_loop.hpp"
#include "outputs/osc_output.hpp"
#include "support/bench.hpp"

#include <boost/asio/buffer.hpp>
#include <boost/asio/io_context.hpp>
#include <boost/asio/ip/udp.hpp>

#include <atomic>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <numbers>
#include <thread>
#include <unistd.h>

namespace {

using namespace millpond;
using boost::asio::ip::udp;

struct Rig {
    std::size_t channels;
    double rate_hz;
    std::size_t packet_frames;
};

udp::endpoint loopback(std::uint16_t port) {
    return {boost::asio::ip::address_v4::loopback(), port};
}

constexpr std::size_t packets_between_bursts = 40;
constexpr std::size_t burst_packets = 10;

/// Faint noise, and every 40 ms ten of a loud 200 Hz: one trigger each.
std::vector<float> stream_of(const Rig& rig, std::size_t packets) {
    auto data = bench::noise(packets * rig.packet_frames * rig.channels, 5.0);
    for (std::size_t frame = 0; frame < packets * rig.packet_frames; ++frame) {
        const std::size_t packet = frame / rig.packet_frames % packets_between_bursts;
        if (packet < burst_packets && frame > static_cast<std::size_t>(rig.rate_hz)) {
            const double value =
                1000.0 * std::sin(2.0 * std::numbers::pi * 200.0 * static_cast<double>(frame) / rig.rate_hz);
            for (std::size_t c = 0; c < rig.channels; ++c) {
                data[frame * rig.channels + c] += static_cast<float>(value);
            }
        }
    }
    return data;
}

/// Sends packet after packet on the millisecond and notes when.
std::vector<std::int64_t> send_stream(const Rig& rig, const std::vector<float>& data, std::uint16_t port) {
    boost::asio::io_context context;
    udp::socket socket(context, udp::v4());
    socket.connect(loopback(port));
    const std::size_t values = rig.packet_frames * rig.channels, packets = data.size() / values;
    std::vector<std::int64_t> sent(packets);
    std::vector<std::uint8_t> bytes(12 + 2 * values);
    Nanos due = monotonic_now();
    for (std::size_t packet = 0; packet < packets; ++packet, due += Nanos{1'000'000}) {
        const auto timestamp = static_cast<std::uint32_t>(packet * rig.packet_frames);
        // RFC 3550 section 5.1, written out: version 2, payload type 96, one sender.
        const std::uint8_t header[12] = {0x80,
                                         96,
                                         static_cast<std::uint8_t>(packet >> 8),
                                         static_cast<std::uint8_t>(packet),
                                         static_cast<std::uint8_t>(timestamp >> 24),
                                         static_cast<std::uint8_t>(timestamp >> 16),
                                         static_cast<std::uint8_t>(timestamp >> 8),
                                         static_cast<std::uint8_t>(timestamp),
                                         1,
                                         2,
                                         3,
                                         4};
        std::copy(std::begin(header), std::end(header), bytes.begin());
        for (std::size_t i = 0; i < values; ++i) {
            const auto count = static_cast<std::int16_t>(std::lround(data[packet * values + i] / 0.1F));
            bytes[12 + 2 * i] = static_cast<std::uint8_t>(static_cast<std::uint16_t>(count) >> 8);
            bytes[13 + 2 * i] = static_cast<std::uint8_t>(count);
        }
        const timespec at{static_cast<time_t>(due.count() / 1'000'000'000),
                          static_cast<long>(due.count() % 1'000'000'000)};
        clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &at, nullptr);
        sent[packet] = monotonic_now().count();
        boost::system::error_code ignored;
        socket.send(boost::asio::buffer(bytes), 0, ignored);
    }
    return sent;
}

/// Notes when each datagram whose last byte is `wanted` arrives, until told to stop.
class Receiver {
  public:
    explicit Receiver(int wanted) : socket_(context_, loopback(0)), wanted_(wanted), thread_([this] { run(); }) {}
    ~Receiver() {
        if (thread_.joinable()) {
            stop();
        }
    }
    [[nodiscard]] std::uint16_t port() { return socket_.local_endpoint().port(); }
    std::vector<std::int64_t> stop() {
        stopping_ = true;
        udp::socket(context_, udp::v4()).send_to(boost::asio::buffer("", 1), loopback(port()));
        thread_.join();
        return arrived_;
    }

  private:
    void run() {
        arrived_.reserve(200000);
        std::uint8_t packet[512];
        while (!stopping_) {
            const std::size_t size = socket_.receive(boost::asio::buffer(packet));
            if (!stopping_ && (wanted_ < 0 || packet[size - 1] == wanted_)) {
                arrived_.push_back(monotonic_now().count());
            }
        }
    }
    boost::asio::io_context context_;
    udp::socket socket_;
    int wanted_;
    std::atomic<bool> stopping_{false};
    std::vector<std::int64_t> arrived_;
    std::thread thread_;
};

/// The session's journal, and a note of which sample each pulse stood at.
struct NotedJournal : LoopJournal {
    SessionWriter& writer;
    std::vector<std::uint64_t> pulses;
    explicit NotedJournal(SessionWriter& to) : writer(to) { pulses.reserve(100000); }
    void take(const Event& event) noexcept override {
        if (event.kind == EventKind::pulse) {
            pulses.push_back(event.sample.value);
        }
        writer.loop_sink().take(event);
    }
    void store(const FrameBlock& block) noexcept override { writer.store(block); }
    void time_packet(std::int64_t a, std::int64_t b, std::int64_t c) noexcept override {
        writer.time_packet({a, b, c});
    }
    [[nodiscard]] bool failed() const noexcept override { return writer.failed(); }
};

DetectorSettings quick_detector() {
    DetectorSettings detector;
    detector.method = DetectionMethod::envelope;
    detector.filter.order = 2;
    detector.envelope = {EnvelopeMethod::rectify, 1.0};
    detector.floor.settle_s = 0.2;
    detector.floor.freeze_ms = 20.0;
    detector.threshold = {20.0, 10.0, 0.0};
    detector.blanking_ms = 0.0;
    return detector;
}

std::vector<double> ours_us(const Rig& rig, const std::vector<float>& data) {
    Receiver receiver(1);
    StreamSettings stream;
    stream.port = static_cast<std::uint16_t>(20000 + getpid() % 20000);
    stream.encoding = SampleEncoding::l16;
    stream.rate_hz = rig.rate_hz;
    stream.channels = static_cast<std::uint32_t>(rig.channels);
    stream.microvolts_per_count = 0.1;
    stream = resolved(stream, "bench");
    const auto source = open_source(stream);
    OutputSettings to;
    to.port = receiver.port();
    OscOutput output(to);
    ArbiterSettings arbiter;
    arbiter.lockout_ms = 5.0;
    arbiter.limits.max_pulses_per_second = 1000;
    arbiter.limits.max_pulses_per_session = 1000000;
    arbiter.limits = for_sweeps(arbiter.limits);
    const Hertz rate{rig.rate_hz};
    const auto channels = ripple_channels(rig.channels);
    SessionSettings session;
    session.folder =
        (std::filesystem::temp_directory_path() / ("millpond_loop_bench_" + std::to_string(getpid()))).string();
    SessionAbout about;
    about.program = "loop_bench";
    about.rate = rate;
    about.channels = channels;
    const auto writer = SessionWriter::open(session, about);
    NotedJournal journal(*writer);
    LineBoard board;
    PulseLines lines(std::vector<PulseLinePlan>{{&output, {Nanos{100'000}, 1, Nanos{1'000'000}}, Follows::pulse}},
                     board, writer->pulse_sink());
    SpscRing<Command> commands(16);
    LiveLoopSettings settings;
    settings.start_armed = true;
    LiveLoop loop(settings, *source, lines, journal, commands, [&](EventSink& sink, PulsePort& port) {
        return Engine(Detector::make(quick_detector(), channels, rate), arbiter, {}, rate, sink, port);
    });
    std::thread thread([&] { loop.run(); });
    const auto sent = send_stream(rig, data, stream.port);
    std::this_thread::sleep_for(std::chrono::milliseconds(50));
    loop.stop();
    thread.join();
    std::filesystem::remove_all(session.folder);
    const auto arrived = receiver.stop();
    std::vector<double> us;
    for (std::size_t i = 0; i < std::min(arrived.size(), journal.pulses.size()); ++i) {
        us.push_back(static_cast<double>(arrived[i] - sent[journal.pulses[i] / rig.packet_frames]) / 1e3);
    }
    if (arrived.size() != journal.pulses.size()) {
        std::printf("  %zu pulses ordered, %zu received\n", journal.pulses.size(), arrived.size());
    }
    return us;
}

std::vector<double> bare_us(const Rig& rig, const std::vector<float>& data) {
    Receiver receiver(-1);
    boost::asio::io_context context;
    udp::socket in(context, loopback(0)), out(context, udp::v4());
    out.connect(loopback(receiver.port()));
    const std::size_t packets = data.size() / rig.packet_frames / rig.channels;
    std::thread echo([&] {
        std::vector<std::uint8_t> packet(65536);
        const std::vector<std::uint8_t> answer(16, 1); // as long as a pulse order
        for (std::size_t i = 0; i < packets; ++i) {
            in.receive(boost::asio::buffer(packet));
            out.send(boost::asio::buffer(answer));
        }
    });
    const auto sent = send_stream(rig, data, in.local_endpoint().port());
    echo.join();
    std::this_thread::sleep_for(std::chrono::milliseconds(50));
    const auto arrived = receiver.stop();
    std::vector<double> us;
    for (std::size_t i = packets_between_bursts; i < std::min(arrived.size(), sent.size()); ++i) {
        us.push_back(static_cast<double>(arrived[i] - sent[i]) / 1e3);
    }
    return us;
}

double quantile(std::vector<double>& sorted, double q) {
    return sorted.empty()
               ? 0.0
               : sorted[std::min(sorted.size() - 1, static_cast<std::size_t>(q * static_cast<double>(sorted.size())))];
}

void print(const char* name, std::vector<double>& us) {
    std::sort(us.begin(), us.end());
    std::printf("  %-10s p50 %7.1f  p99 %7.1f  p99.9 %7.1f  max %8.1f us  count %zu\n", name, quantile(us, 0.5),
                quantile(us, 0.99), quantile(us, 0.999), us.empty() ? 0.0 : us.back(), us.size());
}

void compare(const Rig& rig, int rounds, double seconds) {
    const auto packets = static_cast<std::size_t>(seconds * 1000.0);
    const auto data = stream_of(rig, packets);
    std::printf("%zu channels x %g Hz, packets of 1 ms (%zu bytes)\n", rig.channels, rig.rate_hz,
                12 + 2 * rig.packet_frames * rig.channels);
    std::vector<double> ours, bare;
    for (int round = 0; round < rounds; ++round) {
        for (auto& us : ours_us(rig, data)) {
            ours.push_back(us);
        }
        for (auto& us : bare_us(rig, data)) {
            bare.push_back(us);
        }
    }
    print("ours", ours);
    print("bare loop", bare);
    std::printf("  ratio      p50 %7.2f  p99 %7.2f\n", quantile(ours, 0.5) / quantile(bare, 0.5),
                quantile(ours, 0.99) / quantile(bare, 0.99));
    std::fflush(stdout);
}

} // namespace

int main(int argc, char** argv) {
    const int rounds = argc > 1 ? std::atoi(argv[1]) : 4;
    const double seconds = argc > 2 ? std::atof(argv[2]) : 10.0;
    compare({8, 2000.0, 2}, rounds, seconds);
    compare({64, 30000.0, 30}, rounds, seconds);
}
