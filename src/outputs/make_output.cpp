#include "outputs/make_output.hpp"

#include "outputs/daq_line_output.hpp"
#include "outputs/gpio_line_output.hpp"
#include "outputs/osc_output.hpp"
#include "outputs/parallel_port_output.hpp"
#include "outputs/serial_bytes_output.hpp"
#include "outputs/serial_lines_output.hpp"
#include "outputs/silent_output.hpp"

#include <map>

namespace millpond {
namespace {

/// Ports that several outputs may share, by device.
struct Ports {
    std::map<std::string, std::shared_ptr<ParallelPort>> parallel;
    std::map<std::string, std::shared_ptr<SerialPort>> serial;
};

std::unique_ptr<Output> on_parallel_port(const OutputSettings& settings, Ports& ports) {
    auto& port = ports.parallel[settings.device];
    if (!port) {
        port = std::make_shared<ParallelPort>(settings.device, settings.where("device"));
    }
    return std::make_unique<ParallelPortOutput>(settings, port);
}

std::unique_ptr<Output> on_modem_line(const OutputSettings& settings, Ports& ports) {
    auto& port = ports.serial[settings.device];
    if (!port) {
        port = std::make_shared<SerialPort>(settings.device, settings.where("device"), settings.baud);
    }
    return std::make_unique<SerialLinesOutput>(settings, port);
}

std::unique_ptr<Output> make_output(const OutputSettings& settings, Ports& ports) {
    switch (settings.kind) {
    case OutputKind::osc:
        return std::make_unique<OscOutput>(settings);
    case OutputKind::serial_lines:
        return on_modem_line(settings, ports);
    case OutputKind::serial_bytes:
        return std::make_unique<SerialBytesOutput>(settings);
    case OutputKind::parallel_port:
        return on_parallel_port(settings, ports);
    case OutputKind::daq_line:
        return make_daq_line(settings);
    case OutputKind::gpio_line:
        return make_gpio_line(settings);
    case OutputKind::silent:
        break;
    }
    return std::make_unique<SilentOutput>();
}

} // namespace

std::vector<std::unique_ptr<Output>> make_outputs(const std::vector<OutputSettings>& settings) {
    std::vector<std::unique_ptr<Output>> outputs;
    outputs.reserve(settings.size());
    Ports ports;
    for (const auto& each : settings) {
        outputs.push_back(make_output(each, ports));
    }
    return outputs;
}

} // namespace millpond
