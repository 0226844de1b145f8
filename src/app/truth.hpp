// Ripples as truth from an events table: the generator's or a person's labels. Thread: cold.
#pragma once

#include "referee/ripple.hpp"

#include <cstdint>
#include <filesystem>

namespace millpond {

/// The rows of trial_type `ripple`, by onset. Refuses a table that has rows but none of them (unless all are what an
/// invented recording holds beside ripples), and ripples that lie beyond a recording of `frames` frames: a table of
/// another recording.
[[nodiscard]] Ripples ripples_from_table(const std::filesystem::path& table, Hertz rate, std::uint64_t frames);

} // namespace millpond
