// An agreement as text, as a table and as JSON.
#include "referee/agreement.hpp"
#include "referee/score_json.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::string figure(double value, int decimals, const char* absent = "n/a") {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, decimals) : absent;
}

std::string with_interval(const Proportion& part) {
    return part.of == 0 ? "n/a"
                        : fmt::format("{} of {}, {:.1f} % ({:.1f} to {:.1f})", part.count, part.of, 100.0 * part.share,
                                      100.0 * part.low, 100.0 * part.high);
}

std::size_t widest(const Agreement& agreement) {
    std::size_t width = 0;
    for (const auto& list : agreement.lists) {
        width = std::max(width, list.name.size());
    }
    return width;
}

std::string shared_rows(const Agreement& agreement) {
    const std::size_t first = widest(agreement) + 2;
    std::string text = fmt::format("  {:<{}}{:>6}", "events of", first, "all");
    for (const auto& list : agreement.lists) {
        text += "  " + list.name;
    }
    text += "\n";
    for (std::size_t of = 0; of < agreement.lists.size(); ++of) {
        text += fmt::format("  {:<{}}{:>6}", agreement.lists[of].name, first, agreement.lists[of].ripples.size());
        for (std::size_t with = 0; with < agreement.lists.size(); ++with) {
            const auto cell = of == with ? std::string("-") : fmt::format("{}", agreement.side(of, with).shared.count);
            text += fmt::format("{:>{}}", cell, agreement.lists[with].name.size() + 2);
        }
        text += "\n";
    }
    return text;
}

std::string label_rows(const Agreement& agreement, std::size_t labels) {
    const std::size_t width = widest(agreement) + 2;
    std::string text = fmt::format("\nLabels of {}: {}. Each rule against them, shares with 95 % intervals\n"
                                   "  {:<{}}{:<34}{:>6}  {:<34}{:>6}{:>10}{:>9}\n",
                                   agreement.lists[labels].name, agreement.lists[labels].ripples.size(), "rule", width,
                                   "labels found", "missed", "events that are labelled", "extra", "onset ms", "end ms");
    for (std::size_t rule = 0; rule < agreement.lists.size(); ++rule) {
        if (agreement.lists[rule].by_person) {
            continue;
        }
        const auto& found = agreement.side(labels, rule);
        const auto& labelled = agreement.side(rule, labels).shared;
        text += fmt::format("  {:<{}}{:<34}{:>6}  {:<34}{:>6}{:>10}{:>9}\n", agreement.lists[rule].name, width,
                            with_interval(found.shared), found.shared.of - found.shared.count, with_interval(labelled),
                            labelled.of - labelled.count, figure(found.onset_difference_ms.median, 1),
                            figure(found.end_difference_ms.median, 1));
    }
    return text + "  onset, end: median of rule - label over the labels found; positive: the rule is later\n";
}

} // namespace

std::string agreement_text(const Agreement& agreement, Hertz rate) {
    std::string text = "\nEvents of each list, and how many of them overlap in time with one of each other list\n";
    text += shared_rows(agreement);
    text += fmt::format("  compared over time that all judged: {:.1f} s left out as artefacts, with {} events\n",
                        static_cast<double>(frames_in(agreement.excluded)) / rate.value, agreement.left_out);
    for (std::size_t i = 0; i < agreement.lists.size(); ++i) {
        text += agreement.lists[i].by_person ? label_rows(agreement, i) : std::string{};
    }
    return text;
}

std::string agreement_table(const Agreement& agreement) {
    std::string text = "events_of\tother\tevents\tshared\tnot_shared\tshare\tshare_low\tshare_high\t"
                       "onset_difference_ms\tend_difference_ms\n";
    for (const auto& side : agreement.sides) {
        text += fmt::format("{}\t{}\t{}\t{}\t{}\t{}\t{}\t{}\t{}\t{}\n", agreement.lists[side.of].name,
                            agreement.lists[side.with].name, side.shared.of, side.shared.count,
                            side.shared.of - side.shared.count, figure(side.shared.share, 4),
                            figure(side.shared.low, 4), figure(side.shared.high, 4),
                            figure(side.onset_difference_ms.median, 2), figure(side.end_difference_ms.median, 2));
    }
    return text;
}

nlohmann::ordered_json agreement_json(const Agreement& agreement, Hertz rate) {
    Json lists = Json::array(), pairs = Json::array();
    for (const auto& list : agreement.lists) {
        lists.push_back({{"name", list.name}, {"by_person", list.by_person}, {"events", list.ripples.size()}});
    }
    for (const auto& side : agreement.sides) {
        pairs.push_back({{"events_of", agreement.lists[side.of].name},
                         {"other", agreement.lists[side.with].name},
                         {"shared", json_of(side.shared)},
                         {"onset_difference_ms", json_of(side.onset_difference_ms)},
                         {"end_difference_ms", json_of(side.end_difference_ms)}});
    }
    return {{"lists", lists},
            {"pairs", pairs},
            {"excluded_s", static_cast<double>(frames_in(agreement.excluded)) / rate.value},
            {"events_left_out", agreement.left_out},
            {"definitions",
             {{"shared", "events that have a frame in common with one of the other list"},
              {"difference", "other - own, of the partner with most frames in common"},
              {"left_out", "events that touch time which one of the rules did not judge"}}}};
}

} // namespace millpond
