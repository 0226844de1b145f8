// A line of a GPIO chip, through libgpiod.
#pragma once

#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <memory>

namespace millpond {

/// Requests the line as an output, low. Refuses a device that is not there or no GPIO chip, a line that it has not or
/// that another program holds; and always where this program was built without libgpiod. Thread: control.
[[nodiscard]] std::unique_ptr<Output> make_gpio_line(const OutputSettings& settings);

} // namespace millpond
