// Samples of a data acquisition board's analogue input, through comedilib. Thread: control.
#pragma once

#include "intake/sample_source.hpp"
#include "intake/stream_settings.hpp"

#include <memory>

namespace millpond {

/// Starts the board's own clock: it samples channels 0 to `channels` - 1 from here on. Refuses a device that is not
/// there or no board of comedi, a subdevice that cannot stream analogue input, channels and ranges that it has not, and
/// a rate that its clock cannot keep; and always where this program was built without comedilib. `settings` is what
/// `resolved` returned.
[[nodiscard]] std::unique_ptr<SampleSource> open_daq_source(const StreamSettings& settings);

} // namespace millpond
