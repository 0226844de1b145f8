// The textbook chain asked of bench/scipy_textbook.py on the same samples: nobody should have to believe ours.
// Thread: cold. Needs /usr/bin/python3 with SciPy.
#pragma once

#include "base/channels.hpp"
#include "base/units.hpp"
#include "detector/detector_settings.hpp"

#include <span>
#include <vector>

namespace millpond::bench {

/// Decision samples that the script finds; throws where it cannot run.
[[nodiscard]] std::vector<SampleIndex> scipy_textbook(const DetectorSettings& settings, const Channels& channels,
                                                      Hertz rate, std::span<const float> data);

/// How many of `a` have one of `b` within `frames`.
[[nodiscard]] std::size_t shared(const std::vector<SampleIndex>& a, const std::vector<SampleIndex>& b,
                                 std::uint64_t frames);

} // namespace millpond::bench
