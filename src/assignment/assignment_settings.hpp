// What a user may say about where the condition of a session comes from, where it is not written in the settings.
// Thread: control.
#pragma once

#include "base/describe.hpp"

#include <string>

namespace millpond {

struct AssignmentSettings {
    std::string file;
    std::string code;

    bool operator==(const AssignmentSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, AssignmentSettings& assignment) {
    visit.text("file", assignment.file,
               "list of conditions made beforehand by `assign`, sealed or open (condition: assigned)");
    visit.text("code", assignment.code, "which session of that list this one is");
}

} // namespace millpond
