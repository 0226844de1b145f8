#include "outputs/gpio_line_output.hpp"

#include "base/refusal.hpp"

#ifdef MILLPOND_GPIOD
#include "outputs/device_file.hpp"
#include "outputs/library_line_output.hpp"

#include <cerrno>
#include <cstring>
#include <gpiod.h>
#include <string>
#endif

namespace millpond {

#ifdef MILLPOND_GPIOD
namespace {

struct GpioLine {
    gpiod_chip* chip;
    gpiod_line* line;
};

[[noreturn]] void refuse_line(const OutputSettings& settings, gpiod_chip* chip) {
    const auto found = std::to_string(settings.channel) + " (" + std::strerror(errno) + ")";
    const auto lines = gpiod_chip_num_lines(chip);
    gpiod_chip_close(chip);
    throw Refusal(settings.where("channel"), found,
                  "0 to " + std::to_string(lines - 1) + ", a line that no other program holds");
}

void* open_line(const OutputSettings& settings, bool level) {
    auto* chip = settings.device.empty() ? nullptr : gpiod_chip_open(settings.device.c_str());
    if (chip == nullptr) {
        if (errno == ENOTTY || errno == ENODEV || errno == EINVAL) {
            throw Refusal(settings.where("device"), settings.device + " (no GPIO chip)",
                          "a GPIO chip, such as /dev/gpiochip0");
        }
        refuse_open(settings.where("device"), settings.device);
    }
    auto* line = gpiod_chip_get_line(chip, settings.channel);
    if (line == nullptr || gpiod_line_request_output(line, "millpond", level ? 1 : 0) != 0) {
        refuse_line(settings, chip);
    }
    return new GpioLine{chip, line};
}

bool write_line(void* line, bool level) noexcept {
    return gpiod_line_set_value(static_cast<GpioLine*>(line)->line, level ? 1 : 0) == 0;
}

bool line_answers(void* line) noexcept {
    return gpiod_line_get_value(static_cast<GpioLine*>(line)->line) >= 0;
}

void close_line(void* line) noexcept {
    auto* gpio = static_cast<GpioLine*>(line);
    gpiod_chip_close(gpio->chip); // gives the line back too
    delete gpio;
}

} // namespace

std::unique_ptr<Output> make_gpio_line(const OutputSettings& settings) {
    return std::make_unique<LibraryLineOutput>(settings, LineLibrary{open_line, write_line, line_answers, close_line});
}
#else
std::unique_ptr<Output> make_gpio_line(const OutputSettings& settings) {
    throw Refusal(settings.where("kind"), "gpio_line, but this program was built without libgpiod",
                  "another kind, or a program built where libgpiod-dev is installed");
}
#endif

} // namespace millpond
