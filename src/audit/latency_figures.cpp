#include "audit/latency_figures.hpp"

#include "base/histogram.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace millpond {
namespace {

using Values = std::vector<std::int64_t>;

void add_measured(Values& values, std::int64_t ns) {
    if (ns != PulseDetail::not_measured) {
        values.push_back(ns);
    }
}

struct OverPulses {
    Values packing, transport, wake, compute, output, pulse_end;

    void take(const Event& event) {
        if (event.kind == EventKind::pulse) {
            const auto pulse = event.as<PulseDetail>();
            add_measured(packing, pulse.packing_ns);
            add_measured(transport, pulse.transport_ns);
            add_measured(wake, pulse.wake_ns);
            add_measured(compute, pulse.compute_ns);
            add_measured(output, pulse.output_ns);
        } else if (event.kind == EventKind::pulse_end) {
            add_measured(pulse_end, event.as<PulseEndDetail>().late_ns);
        }
    }
};

using OverPackets = std::array<LatencyHistogram, latency_part_count>;

void take(OverPackets& packets, const Event& event) {
    if (event.kind == EventKind::latency_bins && event.code < packets.size()) {
        for (const auto& bin : event.as<LatencyBins>().bins) {
            packets[event.code].add_bin(bin.bin, bin.count);
        }
    }
}

std::optional<LatencySummary> summary_of(const OverPackets& packets, LatencyPart part) {
    const auto& counted = packets[static_cast<std::size_t>(part)];
    if (counted.count() == 0) {
        return std::nullopt;
    }
    return LatencySummary{counted.count(),           counted.quantile_ns(0.5),   counted.quantile_ns(0.9),
                          counted.quantile_ns(0.99), counted.quantile_ns(0.999), counted.max_ns()};
}

} // namespace

std::optional<LatencySummary> summary_of(std::vector<std::int64_t> values_ns) {
    if (values_ns.empty()) {
        return std::nullopt;
    }
    std::sort(values_ns.begin(), values_ns.end());
    const auto at = [&values_ns](double q) {
        const auto rank = static_cast<std::size_t>(std::ceil(q * static_cast<double>(values_ns.size())));
        return values_ns[std::max<std::size_t>(rank, 1) - 1];
    };
    return LatencySummary{values_ns.size(), at(0.5), at(0.9), at(0.99), at(0.999), values_ns.back()};
}

std::vector<LatencyRow> latency_rows(std::span<const Event> events) {
    OverPulses pulses;
    OverPackets packets;
    for (const auto& event : events) {
        pulses.take(event);
        take(packets, event);
    }
    return {{"packing", "pulses", "decision sample to last sample of its packet", summary_of(pulses.packing)},
            {"transport", "pulses", "packet sent to packet arrived", summary_of(pulses.transport)},
            {"wake", "pulses", "packet arrived to loop begins on it", summary_of(pulses.wake)},
            {"compute", "pulses", "loop begins to decision made", summary_of(pulses.compute)},
            {"output", "pulses", "decision made to write returned", summary_of(pulses.output)},
            {"line", "pulses", "write returned to edge on the line", std::nullopt},
            {"pulse end", "pulses", "planned end to order to fall", summary_of(pulses.pulse_end)},
            {"transport", "packets", "packet sent to packet arrived", summary_of(packets, LatencyPart::transport)},
            {"wake", "packets", "packet arrived to loop begins on it", summary_of(packets, LatencyPart::wake)},
            {"loop", "packets", "packet arrived to loop done with it", summary_of(packets, LatencyPart::loop)}};
}

} // namespace millpond
