#include "app/status_line.hpp"

#include <fmt/format.h>

#include <cmath>

namespace millpond {
namespace {

std::string loop_latency(const LiveFigures& figures) {
    if (!figures.loop_p50_ns || !figures.loop_p99_ns) {
        return "not measured";
    }
    return fmt::format("{:.0f}/{:.0f} us", static_cast<double>(*figures.loop_p50_ns) / 1e3,
                       static_cast<double>(*figures.loop_p99_ns) / 1e3);
}

std::string closed_gates(const LiveFigures& figures) {
    std::string text;
    for (const auto& name : figures.gates_closed) {
        text += text.empty() ? ", closed: " + name : ", " + name;
    }
    return text;
}

std::string epoch_and_time_left(const LiveFigures& figures, Hertz rate) {
    if (!figures.epoch) {
        return {};
    }
    const auto& epoch = *figures.epoch;
    auto text = fmt::format(" | {}{}", epoch.name, epoch.pulses ? "" : ", no pulses");
    if (epoch.frames > 0) {
        const SampleIndex end = epoch.from + epoch.frames;
        const auto left = end > figures.upto ? seconds_at(SampleIndex{end - figures.upto}, rate) : 0.0;
        text += fmt::format(", {:.0f}:{:02.0f} left", std::floor(left / 60.0), std::floor(std::fmod(left, 60.0)));
    }
    return text;
}

std::string floor_and_threshold(const LiveFigures& figures) {
    if (figures.floors.empty()) {
        return "floor not yet";
    }
    const auto& decides = figures.floors.back(); // the mean over sites where it votes, else the last site
    return fmt::format("floor {:.1f} uV, threshold {:.1f} uV{}", decides.mean, decides.threshold,
                       decides.settled != 0 ? "" : " (settling)");
}

} // namespace

std::string status_line(const LiveFigures& figures, Hertz rate, bool blinded) {
    const auto lost = figures.packets[static_cast<std::size_t>(PacketCause::lost)];
    auto line = fmt::format("{}{}{} | {:g} Hz, {:.0f} s | lost {} | {} | detections {}, {} {} | loop p50/p99 {}",
                            name_of(figures.state), closed_gates(figures), epoch_and_time_left(figures, rate),
                            rate.value, seconds_at(figures.upto, rate), lost, floor_and_threshold(figures),
                            figures.detections, blinded ? "triggers" : "pulses",
                            blinded ? figures.triggers : figures.pulses, loop_latency(figures));
    if (figures.speed) {
        line += fmt::format(" | speed {:.3g}", *figures.speed);
    }
    if (!figures.trouble.empty()) {
        line += " | TROUBLE: " + figures.trouble;
    }
    return line;
}

} // namespace millpond
