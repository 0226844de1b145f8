// What a user may say about how the loop runs on this computer. Thread: control.
#pragma once

#include "base/describe.hpp"

namespace millpond {

struct RealtimeSettings {
    int priority = 0;
    int core = -1;
    bool lock_memory = false;
    bool spin = false;

    bool operator==(const RealtimeSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, RealtimeSettings& realtime) {
    visit.whole("priority", realtime.priority, {0, 99},
                "SCHED_FIFO priority of the loop and pulse threads; 0: the ordinary scheduler");
    visit.whole("core", realtime.core, {-1, 1023}, "processor core that the loop is bound to; -1: any");
    visit.flag("lock_memory", realtime.lock_memory, "whether the program's memory is locked into RAM");
    visit.flag("spin", realtime.spin,
               "whether the loop polls without sleeping: lower wake latency for one core's full time");
}

} // namespace millpond
