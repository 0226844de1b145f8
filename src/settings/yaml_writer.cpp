#include "settings/yaml_writer.hpp"

#include <charconv>

namespace millpond {

std::string shortest(double value) {
    char text[64];
    const auto written = std::to_chars(text, text + sizeof text, value);
    return {text, written.ptr};
}

} // namespace millpond
