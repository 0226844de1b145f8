#include "audit/output_figures.hpp"

#include <cstring>
#include <map>

namespace millpond {
namespace {

struct Seen {
    OutputFigure figure;
    std::vector<std::int64_t> widths, latenesses;
};

void take_end(std::map<std::uint16_t, Seen>& outputs, const Event& event) {
    const auto end = event.as<PulseEndDetail>();
    auto& seen = outputs[end.output];
    seen.figure.marker = end.marker != 0;
    ++seen.figure.ends;
    seen.widths.push_back(end.width_ns);
    seen.latenesses.push_back(end.late_ns);
}

void take_device(std::map<std::uint16_t, Seen>& outputs, const Event& event) {
    const auto device = event.as<DeviceDetail>();
    auto& figure = outputs[device.output].figure;
    figure.name.assign(device.name.data(), ::strnlen(device.name.data(), device.name.size()));
    figure.marker = device.marker != 0;
    figure.lost += event.code == static_cast<std::uint8_t>(DeviceState::lost) ? 1 : 0;
}

} // namespace

std::vector<OutputFigure> output_figures(std::span<const Event> events) {
    std::map<std::uint16_t, Seen> outputs;
    for (const auto& event : events) {
        if (event.kind == EventKind::pulse_end) {
            take_end(outputs, event);
        } else if (event.kind == EventKind::device) {
            take_device(outputs, event);
        }
    }
    std::vector<OutputFigure> figures;
    for (auto& [output, seen] : outputs) {
        seen.figure.output = output;
        seen.figure.width = summary_of(std::move(seen.widths));
        seen.figure.late = summary_of(std::move(seen.latenesses));
        figures.push_back(std::move(seen.figure));
    }
    return figures;
}

} // namespace millpond
