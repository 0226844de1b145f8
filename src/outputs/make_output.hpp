// From settings to outputs. Thread: control.
#pragma once

#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <memory>
#include <vector>

namespace millpond {

/// Opens every output, in the order of settings; each is ordered low once. Refuses a device that is not there, may not
/// be opened, is of another kind or in use, and a kind that this program was built without.
[[nodiscard]] std::vector<std::unique_ptr<Output>> make_outputs(const std::vector<OutputSettings>& settings);

} // namespace millpond
