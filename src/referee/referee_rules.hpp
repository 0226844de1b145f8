// The referee's rules by name of their paper, and where each value of each rule comes from. Thread: cold.
// Marks: [seen] read in the paper, [memory] from memory, [here] chosen here, since the paper leaves it open or says
// nothing that was read.
//
// gillespie_2024   Gillespie et al. 2024, eLife 90944.
//                  150-250 Hz, squared, summed over sites, Gaussian of SD 4 ms, square root; mean + 2 SD for 15 ms or
//                  more; edges at the mean [seen]. Butterworth of order 3, forward and backward; mean and SD over the
//                  whole recording, not clipped; nothing merged; no shortest duration beyond the 15 ms [here].
// deceuninck_2024  Deceuninck & Kloosterman 2024, eLife 13:e84004.
//                  140-225 Hz, magnitude of the analytic signal, mean over sites, Gaussian of 15 ms; median + 9 (third
//                  quartile - median); gaps under 20 ms merged; under 40 ms dropped [seen]. The 15 ms are the SD; edges
//                  at the threshold itself; Butterworth of order 3, forward and backward; median and quartile over the
//                  whole recording [here].
// stark_2014       Stark et al. 2014, Neuron 83:467.
//                  Clipped at mean + 4 SD before mean and SD are taken, once; peak at 5 SD, edges at 1 SD; gaps under
//                  15 ms merged, under 15 ms dropped [memory]. Band, filter and envelope as in `millpond` [here].
// millpond         A mix. Band and envelope of gillespie_2024 [seen]; peak 5 SD, edges 1 SD, merging and shortest
//                  duration 15 ms as in stark_2014 [memory]; but clipped at 3 SD, not 4, and again until nothing moves
//                  [here]: ripples that fill a share p of the time raise the SD by 1/sqrt(1 - c^2 p) with clipping at c
//                  SD (derived), for p = 5 % by 1.3 at 3 SD and by 2.2 at 4. Order 3 so that 120 Hz comes out below 2 %
//                  [here]. On Gaussian noise alone it finds up to 0.9 events a minute with one site and 0.2 with four
//                  (NumPy, an hour at 1250 Hz).
//
// The papers look at times of rest or sleep alone; a recording says nothing of that, so all of its time is looked at.
#pragma once

#include "referee/referee_settings.hpp"

#include <optional>
#include <string>
#include <string_view>

namespace millpond {

/// All values of a rule; artefacts as by default.
[[nodiscard]] RefereeSettings settings_of(RefereeRule rule);

/// The rule of that name; empty where there is none.
[[nodiscard]] std::optional<RefereeRule> rule_named(std::string_view name) noexcept;

/// A key that a published rule fixes, with another value than the rule's.
struct Departure {
    std::string key, found, fixed;
};
/// The first one; empty where `settings` are those of their rule, and always for `millpond`.
[[nodiscard]] std::optional<Departure> departure_from_rule(const RefereeSettings& settings);

/// The sentence for a refusal: what is allowed instead.
[[nodiscard]] std::string allowed_instead(const Departure& departure, RefereeRule rule);

} // namespace millpond
