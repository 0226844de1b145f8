// How far lists of ripples agree: rules with each other, a person's labels with each rule. Thread: cold.
//
// Two events share when their closed intervals have a frame in common. Sharing is counted from both sides, since one
// long event of one list may share with several short ones of the other. Of the events that share with it, an event's
// partner is the one with most frames in common, the earlier one of equals; differences of edges are partner - own.
#pragma once

#include "referee/eligible_time.hpp"
#include "referee/ripple.hpp"
#include "referee/scoring.hpp"

#include <nlohmann/json.hpp>

#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace millpond {

struct RippleList {
    std::string name;
    Ripples ripples;        ///< by onset
    bool by_person = false; ///< labels; else a rule's
};

/// One list seen from another's side.
struct SideOfPair {
    std::size_t of = 0, with = 0;     ///< places in the lists
    Proportion shared;                ///< events of `of` that share with one of `with`
    Distribution onset_difference_ms; ///< positive: `with` begins later
    Distribution end_difference_ms;   ///< positive: `with` ends later; labels without a duration have no end
};

struct Agreement {
    std::vector<RippleList> lists; ///< without the events left out
    std::uint64_t left_out = 0;    ///< events of all lists that touch `excluded`
    Intervals excluded;            ///< time that one of the rules did not judge
    std::vector<SideOfPair> sides; ///< every ordered pair

    [[nodiscard]] const SideOfPair& side(std::size_t of, std::size_t with) const;
};

/// `excluded`: time that was not judged by all; events that touch it are left out of all lists.
[[nodiscard]] Agreement agreement_of(std::vector<RippleList> lists, const Intervals& excluded, Hertz rate);

/// Two tables of text for people: shared events of every pair, and each person's labels against each rule.
[[nodiscard]] std::string agreement_text(const Agreement& agreement, Hertz rate);

/// Every ordered pair, one a row, tab-separated.
[[nodiscard]] std::string agreement_table(const Agreement& agreement);

[[nodiscard]] nlohmann::ordered_json agreement_json(const Agreement& agreement, Hertz rate);

/// Joined, ascending, not touching.
[[nodiscard]] Intervals union_of(const Intervals& a, const Intervals& b);

} // namespace millpond
