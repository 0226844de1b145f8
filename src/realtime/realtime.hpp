// Gives a thread what a loop needs from this computer: priority, a core of its own, memory that stays. Thread: control.
#pragma once

#include "realtime/realtime_settings.hpp"

#include <thread>

namespace millpond {

/// Priority and core, as settings say. Refuses, with the remedy, what this user or computer may not have: a session
/// that asked for a priority must not run without it unnoticed.
void make_realtime(std::thread& thread, const RealtimeSettings& settings);

/// Locks all present and future memory where settings say so. Refuses likewise.
void lock_memory(const RealtimeSettings& settings);

} // namespace millpond
