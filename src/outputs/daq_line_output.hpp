// A digital line of a data acquisition board, through comedilib.
#pragma once

#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <memory>

namespace millpond {

/// Opens the board and makes the line an output, low. Refuses a device that is not there or no board of comedi, a
/// subdevice without digital outputs, a channel that it has not; and always where this program was built without
/// comedilib. Thread: control.
[[nodiscard]] std::unique_ptr<Output> make_daq_line(const OutputSettings& settings);

} // namespace millpond
