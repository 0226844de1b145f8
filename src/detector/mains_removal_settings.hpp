// What a user may say about taking mains hum out before the band-pass. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>

namespace millpond {

enum class MainsMethod : std::uint8_t {
    off,
    adaptive ///< sinusoids at multiples of the mains frequency, learned and subtracted
};
inline constexpr Choice<MainsMethod> mains_methods[] = {{MainsMethod::off, "off"}, {MainsMethod::adaptive, "adaptive"}};

struct MainsRemovalSettings {
    MainsMethod method = MainsMethod::off;
    double frequency_hz = 50.0;
    int harmonics = 5;
    double time_constant_s = 2.0;

    bool operator==(const MainsRemovalSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, MainsRemovalSettings& mains) {
    visit.choice("method", mains.method, mains_methods, "how hum is taken out before the band-pass");
    visit.number("frequency_hz", mains.frequency_hz, {10.0, 100.0},
                 "frequency of the mains; its true value is followed up to 1 Hz away");
    visit.whole("harmonics", mains.harmonics, {1, 12}, "multiples of it that are taken out, the first among them");
    visit.number("time_constant_s", mains.time_constant_s, {0.2, 60.0},
                 "time in which hum is learned; what lasts less is left alone");
}

} // namespace millpond
