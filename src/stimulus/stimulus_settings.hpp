// What a user may say about the stimulus that the stimulator gives. It moves nothing here: it is reckoned with, warned
// of and kept. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <cstdint>
#include <string>

namespace millpond {

enum class ElectrodeShape : std::uint8_t {
    disc,       ///< the flat end of a cut wire, or a planar contact
    hemisphere, ///< a rounded tip
    cylinder    ///< a bare length of wire and its flat end
};
inline constexpr Choice<ElectrodeShape> electrode_shapes[] = {
    {ElectrodeShape::disc, "disc"}, {ElectrodeShape::hemisphere, "hemisphere"}, {ElectrodeShape::cylinder, "cylinder"}};

struct StimulusSettings {
    double current_ua = 0.0;
    double phase_us = 200.0;
    std::uint32_t phases = 2;
    double area_um2 = 0.0;
    double diameter_um = 0.0;
    ElectrodeShape shape = ElectrodeShape::disc;
    double length_um = 0.0;

    bool operator==(const StimulusSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, StimulusSettings& stimulus) {
    visit.number("current_ua", stimulus.current_ua, {0.0, 1e6},
                 "current of the stimulator in one phase, as you set it there; 0: not described");
    visit.number("phase_us", stimulus.phase_us, {1.0, 1e6}, "how long one phase lasts");
    visit.whole("phases", stimulus.phases, {1, 2}, "2: biphasic, charge-balanced; 1: monophasic");
    visit.number("area_um2", stimulus.area_um2, {0.0, 1e12},
                 "bare area of the smaller electrode; 0: from diameter_um and shape");
    visit.number("diameter_um", stimulus.diameter_um, {0.0, 1e6}, "its diameter");
    visit.choice("shape", stimulus.shape, electrode_shapes, "its bare part");
    visit.number("length_um", stimulus.length_um, {0.0, 1e6}, "bare length (shape: cylinder)");
}

} // namespace millpond
