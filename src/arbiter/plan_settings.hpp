// What a user may say about how a session is divided. Thread: control.
#pragma once

#include "base/describe.hpp"

#include <string>
#include <vector>

namespace millpond {

struct EpochSettings {
    std::string name;
    double minutes = 0.0;
    bool pulses = true;

    bool operator==(const EpochSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, EpochSettings& epoch) {
    visit.text("name", epoch.name, "what tables and reports call the epoch; 1 to 21 characters");
    visit.number("minutes", epoch.minutes, {0.0, 100000.0},
                 "its length in the stream; 0: until the command /epoch, or the session's end");
    visit.flag("pulses", epoch.pulses, "whether pulses are allowed in it; else triggers are withheld by rule gate");
}

struct PlanSettings {
    std::vector<EpochSettings> epochs;
    bool ends_session = false;

    bool operator==(const PlanSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, PlanSettings& plan) {
    visit.list("epochs", plan.epochs, "parts of the session, in order, the first from its first sample; none: no plan");
    visit.flag("ends_session", plan.ends_session,
               "whether the session ends with the last epoch; else it goes on without pulses");
}

} // namespace millpond
