#include "proof/report.hpp"

#include "proof/detectors.hpp"

#include <fmt/format.h>

namespace millpond::bench {
namespace {

std::string share(const Estimate& estimate) {
    return fmt::format("{:5.1f} [{:5.1f},{:6.1f}]", 100.0 * estimate.value, 100.0 * estimate.low,
                       100.0 * estimate.high);
}

std::string number(const Estimate& estimate) {
    return fmt::format("{:5.1f} [{:4.1f},{:5.1f}]", estimate.value, estimate.low, estimate.high);
}

std::string rate(const Estimate& estimate) {
    return fmt::format("{:5.2f} [{:4.2f},{:5.2f}]", estimate.value, estimate.low, estimate.high);
}

} // namespace

void Report::begin(const std::string& scene, Hertz rate_of_scene) {
    scene_ = scene;
    rate_ = rate_of_scene;
}

void Report::say(const std::string& sentence) const {
    fmt::print("{}\n", sentence);
    std::fflush(stdout);
}

void Report::head() const {
    say(fmt::format("{:<16} {:>8}  {:<20} {:<19} {:<19} {:<20} {:<19} {:>9}", "detector", "at most", "found %",
                    "median ms", "p90 ms", "before half %", "false per minute", "threshold"));
}

void Report::rows(const std::string& detector, const Curve& curve) {
    for (const double asked : asked_false_per_minute) {
        row(detector, asked, curve);
    }
    keep(detector, curve);
}

void Report::row(const std::string& detector, double asked, const Curve& curve) const {
    const auto figures = figures_at(curve, asked, rate_);
    if (figures) {
        row(detector, fmt::format("{:.1f}", asked), *figures);
    } else {
        say(fmt::format("{:<16} {:>8.1f}  no threshold has so few", detector, asked));
    }
}

void Report::row(const std::string& detector, const std::string& asked, const Figures& figures) const {
    say(fmt::format("{:<16} {:>8}  {:<20} {:<19} {:<19} {:<20} {:<19} {:>9.2f}", detector, asked, share(figures.found),
                    number(figures.latency_median_ms), number(figures.latency_p90_ms), share(figures.before_half),
                    rate(figures.false_per_minute), figures.threshold));
}

void Report::keep(const std::string& detector, const Curve& curve) {
    for (const auto& point : curve) {
        const auto sum = point.sum();
        curves_ +=
            fmt::format("{}\t{}\t{:.3f}\t{:.4f}\t{:.4f}\t{:.1f}\t{:.1f}\n", scene_, detector, point.threshold,
                        sum.false_per_minute(), sum.hit_rate(), sum.latency_ms(0.5, rate_), sum.latency_ms(0.9, rate_));
    }
}

} // namespace millpond::bench
