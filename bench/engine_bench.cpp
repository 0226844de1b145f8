// How fast is the engine over a recording in memory, on one core, against the same chain in SciPy in the same run?
// Usage: engine_bench [REPEATS]   prints one line a case; ratios are medians over the repeats.
// Both sides count processor time of their one thread, so that other programs on the machine take nothing from either.
#include "engine/engine.hpp"
#include "support/bench.hpp"

#include <cstdio>
#include <cstdlib>
#include <string>

namespace {

using namespace millpond;

struct Case {
    std::size_t channels;
    double rate_hz;
    double seconds; // of signal in one pass
    int order;
};

struct Counted : EventSink, PulsePort {
    std::size_t events = 0, pulses = 0;
    void take(const Event& /*event*/) noexcept override { ++events; }
    void fire(const Event& /*trigger*/) noexcept override { ++pulses; }
};

double engine_seconds(const Case& each, const std::vector<float>& data) {
    DetectorSettings detector;
    detector.method = DetectionMethod::envelope;
    detector.filter.order = each.order;
    detector.envelope.method = EnvelopeMethod::rectify;
    detector.vote.rule = VoteRule::count;
    detector.floor.time_constant_s = 1.0; // the start-up, a frame at a time, is over soon
    detector.floor.settle_s = 1.0;
    detector.threshold.deviations = 6.0;
    const Hertz rate{each.rate_hz};
    Counted counted;
    Engine engine(Detector::make(detector, ripple_channels(each.channels), rate), ArbiterSettings{}, {}, rate, counted,
                  counted);
    engine.start(SampleIndex{0}, true);
    // Two passes: the second is the one that counts, settled as a session is after its first seconds.
    const std::size_t frames = data.size() / each.channels, block = 4096;
    double took = 0.0;
    for (std::size_t pass = 0; pass < 2; ++pass) {
        const auto began = read_clock(CLOCK_THREAD_CPUTIME_ID);
        for (std::size_t at = 0; at < frames; at += block) {
            const std::size_t count = std::min(block, frames - at);
            engine.process({SampleIndex{pass * frames + at}, each.channels,
                            std::span(data).subspan(at * each.channels, count * each.channels)});
        }
        took = static_cast<double>((read_clock(CLOCK_THREAD_CPUTIME_ID) - began).count()) / 1e9;
    }
    return took;
}

double scipy_seconds(const Case& each) {
    char command[256];
    // One core for the peer too.
    std::snprintf(command, sizeof command,
                  "OPENBLAS_NUM_THREADS=1 /usr/bin/python3 %s/bench/scipy_chain.py %zu %g %g %d", MILLPOND_SOURCE_DIR,
                  each.channels, each.rate_hz, each.seconds, each.order);
    return std::atof(bench::output_of(command).c_str());
}

void run(const Case& each, int repeats, bool against_scipy) {
    const auto frames = static_cast<std::size_t>(each.rate_hz * each.seconds);
    const auto data = bench::noise(frames * each.channels, 20.0);
    std::vector<double> ours, ratios;
    for (int i = 0; i < repeats; ++i) {
        ours.push_back(engine_seconds(each, data));
        if (against_scipy) {
            ratios.push_back(scipy_seconds(each) / ours.back());
        }
    }
    const double middle = bench::median(ours);
    std::printf("%4zu ch x %6g Hz, order %d: %10.0f times real pace, %6.2f ns a sample", each.channels, each.rate_hz,
                each.order, each.seconds / middle, middle * 1e9 / static_cast<double>(data.size()));
    if (against_scipy) {
        std::printf(", %5.1f times SciPy (%.1f to %.1f)", bench::median(ratios), bench::least(ratios),
                    bench::most(ratios));
    }
    std::printf("\n");
    std::fflush(stdout);
}

} // namespace

int main(int argc, char** argv) {
    const int repeats = argc > 1 ? std::atoi(argv[1]) : 5;
    std::printf("engine: band-pass, envelope, floor, threshold, vote, arbiter; one core; medians of %d\n", repeats);
    run({64, 30000.0, 4.0, 4}, repeats, true);
    run({64, 30000.0, 4.0, 2}, repeats, true);
    run({4, 1250.0, 600.0, 4}, repeats, true);
    run({4, 1250.0, 600.0, 2}, repeats, true);
    std::printf("cost against channels, 30 kHz, order 4\n");
    for (const std::size_t channels : {1, 2, 4, 8, 16, 32, 64, 128, 256}) {
        run({channels, 30000.0, 2.0, 4}, repeats, false);
    }
}
