// Makes the source that the settings ask for. Thread: control.
#pragma once

#include "intake/sample_source.hpp"
#include "intake/stream_settings.hpp"

#include <memory>

namespace millpond {

/// `settings` is what `resolved` returned. Listens, or reads standard input, from here on. Throws Refusal where a port
/// or an address cannot be had.
[[nodiscard]] std::unique_ptr<SampleSource> open_source(const StreamSettings& settings);

} // namespace millpond
