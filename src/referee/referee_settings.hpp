// What a user may say about the referee. Thread: control.
//
// A rule is a set of values for the keys below. A published one is named by its paper and fixes all of them but
// `artefacts`; `rule: millpond` leaves every key free and begins with our default. Where each value comes from, and
// what the papers leave open: referee_rules.hpp.
// Published thresholds span 2-7 SD and give rates 100-fold apart (Liu et al. 2022, Nat Commun 13:6000): say which rule
// a figure was made with.
#pragma once

#include "base/describe.hpp"

#include <cstdint>

namespace millpond {

enum class RefereeRule : std::uint8_t {
    millpond,
    gillespie_2024,
    deceuninck_2024,
    stark_2014
};
inline constexpr Choice<RefereeRule> referee_rules[] = {{RefereeRule::millpond, "millpond"},
                                                        {RefereeRule::gillespie_2024, "gillespie_2024"},
                                                        {RefereeRule::deceuninck_2024, "deceuninck_2024"},
                                                        {RefereeRule::stark_2014, "stark_2014"}};

enum class RefereeEnvelope : std::uint8_t {
    summed_energy, ///< square, sum over sites, Gaussian, square root
    mean_analytic  ///< magnitude of the analytic signal, mean over sites, Gaussian
};
inline constexpr Choice<RefereeEnvelope> referee_envelopes[] = {{RefereeEnvelope::summed_energy, "summed_energy"},
                                                                {RefereeEnvelope::mean_analytic, "mean_analytic"}};

enum class RefereeFloor : std::uint8_t {
    mean_and_deviation, ///< thresholds are mean + k SD
    median_and_quartile ///< thresholds are median + k (third quartile - median)
};
inline constexpr Choice<RefereeFloor> referee_floors[] = {{RefereeFloor::mean_and_deviation, "mean_and_deviation"},
                                                          {RefereeFloor::median_and_quartile, "median_and_quartile"}};

/// What is no signal, or signal on all channels alike: out of events, statistics and eligible time (artefacts.hpp).
struct RefereeArtefactSettings {
    bool exclude = true;
    double pad_ms = 100.0;
    double flat_ms = 10.0;
    double rail_uv = 0.0;
    double common_deviations = 5.0;

    bool operator==(const RefereeArtefactSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, RefereeArtefactSettings& artefacts) {
    visit.flag("exclude", artefacts.exclude,
               "leave artefacts out of events, statistics and eligible time; missing samples are no signal either way");
    visit.number("pad_ms", artefacts.pad_ms, {0.0, 10000.0}, "and so much time before and after each");
    visit.number("flat_ms", artefacts.flat_ms, {0.0, 60000.0},
                 "a channel that keeps one value so long is flat or railed; 0: not looked for");
    visit.number("rail_uv", artefacts.rail_uv, {0.0, 1e9},
                 "values as far from 0 as this are the amplifier's rail; 0: not known");
    visit.number("common_deviations", artefacts.common_deviations, {0.0, 1000.0},
                 "the band's envelope this many SD above its mean on every ripple and reference channel at once; 0, or "
                 "without a reference: not looked for");
}

struct RefereeSettings {
    RefereeRule rule = RefereeRule::millpond;
    RefereeEnvelope envelope = RefereeEnvelope::summed_energy;
    double low_hz = 150.0;
    double high_hz = 250.0;
    int order = 3;
    double smoothing_ms = 4.0;
    RefereeFloor floor = RefereeFloor::mean_and_deviation;
    double clip_deviations = 3.0;
    bool clip_again = true;
    double peak_deviations = 5.0;
    double edge_deviations = 1.0;
    double min_above_peak_ms = 0.0;
    double min_duration_ms = 15.0;
    double merge_gap_ms = 15.0;
    RefereeArtefactSettings artefacts;

    bool operator==(const RefereeSettings&) const = default;
};

template <class Visitor> void describe(Visitor& visit, RefereeSettings& referee) {
    visit.choice("rule", referee.rule, referee_rules,
                 "a published rule fixes all keys but `artefacts`; millpond leaves them free");
    visit.choice("envelope", referee.envelope, referee_envelopes, "how one envelope is made of all ripple sites");
    visit.number("low_hz", referee.low_hz, {1.0, 20000.0},
                 "lower edge of the zero-phase Butterworth band-pass (-6 dB, since it runs forward and backward)");
    visit.number("high_hz", referee.high_hz, {2.0, 24000.0}, "upper edge, likewise; below half the rate");
    visit.whole("order", referee.order, {1, 8}, "order of the low-pass prototype, of each of the two passes");
    visit.number("smoothing_ms", referee.smoothing_ms, {0.1, 100.0}, "SD of the Gaussian that smooths the envelope");
    visit.choice("floor", referee.floor, referee_floors, "what thresholds are counted from, and in");
    visit.number("clip_deviations", referee.clip_deviations, {0.0, 1000.0},
                 "envelopes further than this above the mean enter mean and SD as this far; 0: as they are");
    visit.flag("clip_again", referee.clip_again, "clip at the new mean and SD, until nothing moves");
    visit.number("peak_deviations", referee.peak_deviations, {0.1, 100.0},
                 "a ripple's envelope reaches this many SD (or quartile distances) above the floor");
    visit.number("edge_deviations", referee.edge_deviations, {0.0, 100.0},
                 "a ripple lasts while its envelope is this far above the floor; at most `peak_deviations`");
    visit.number("min_above_peak_ms", referee.min_above_peak_ms, {0.0, 1000.0},
                 "and it stays at `peak_deviations` for this long without a break");
    visit.number("min_duration_ms", referee.min_duration_ms, {0.0, 1000.0},
                 "shorter events are dropped, after merging");
    visit.number("merge_gap_ms", referee.merge_gap_ms, {0.0, 1000.0}, "events nearer to each other are one ripple");
    visit.group("artefacts", referee.artefacts, "what is left out");
}

} // namespace millpond
