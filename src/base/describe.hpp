// How a settings struct tells its keys: once, in `describe`, for the reader, the writer and the reference alike.
// Thread: control.
//
//     struct VetoSettings { double deviations = 5.0; double window_ms = 40.0; };
//
//     template <class Visitor> void describe(Visitor& visit, VetoSettings& veto) {
//         visit.number("deviations", veto.deviations, {0.0, 100.0}, "reference threshold, in deviations above its
//         floor"); visit.number("window_ms", veto.window_ms, {0.0, 1000.0}, "how long a reference crossing vetoes");
//     }
//
// A visitor offers: number (double), whole (integers), flag (bool), choice (enum), text (string), numbers (a vector of
// doubles), group (a struct) and list (a vector of structs). A key carries its unit in its name.
#pragma once

#include <span>
#include <string_view>

namespace millpond {

/// Both ends are allowed values.
struct Range {
    double least;
    double most;
};

/// The word that stands in a settings file for one enumerator.
template <class Enum> struct Choice {
    Enum value;
    std::string_view word;
};

/// The word for `value`; empty where it has none.
template <class Enum> constexpr std::string_view word_for(std::span<const Choice<Enum>> choices, Enum value) noexcept {
    for (const auto& choice : choices) {
        if (choice.value == value) {
            return choice.word;
        }
    }
    return {};
}

} // namespace millpond
