#include "app/tune_tables.hpp"

#include "app/dry_run_tables.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace millpond {
namespace {

std::string figure(double value, int decimals) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, decimals) : "n/a";
}

// Places of axes with more than one value: what tells settings apart.
std::vector<std::size_t> telling_axes(const TuneCandidates& candidates) {
    std::vector<std::size_t> telling;
    for (std::size_t i = 0; i < candidates.axes.size(); ++i) {
        if (candidates.axes[i].values.size() > 1) {
            telling.push_back(i);
        }
    }
    return telling;
}

std::string columns_of(const PartFigures& part) {
    return fmt::format("{:>5}/{:<5} {:>5} {:>9} {:>6} {:>5}", part.hits, part.ripples,
                       figure(100.0 * part.hit_rate().share, 1), figure(part.false_per_minute, 2),
                       figure(part.latency_median_ms, 1), figure(part.latency_p90_ms, 1));
}

std::string cells_of(const PartFigures& part) {
    return fmt::format("{}\t{}\t{}\t{}\t{}\t{}", part.hits, part.ripples, figure(part.hit_rate().share, 4),
                       figure(part.false_per_minute, 4), figure(part.latency_median_ms, 2),
                       figure(part.latency_p90_ms, 2));
}

std::string cell_names(const std::string& part) {
    return fmt::format("\t{0}_hits\t{0}_ripples\t{0}_hit_rate\t{0}_false_per_minute\t{0}_latency_median_ms\t"
                       "{0}_latency_p90_ms",
                       part);
}

std::string key_names(const TuneCandidates& candidates) {
    std::string names;
    for (const auto& axis : candidates.axes) {
        names += names.empty() ? axis.key : fmt::format("\t{}", axis.key);
    }
    return names;
}

std::string joined(const std::vector<std::string>& words, const char* between) {
    return fmt::format("{}", fmt::join(words, between));
}

// The end of a key that no other axis has: `order` for `filter.order`.
std::string short_name(const TuneCandidates& candidates, std::size_t axis) {
    const auto& key = candidates.axes[axis].key;
    const auto end = key.substr(key.find_last_of('.') + 1);
    const auto same = std::count_if(candidates.axes.begin(), candidates.axes.end(), [&](const TuneGrid::Axis& other) {
        return other.key == end || other.key.ends_with("." + end);
    });
    return same > 1 ? key : end;
}

std::string named(const TuneCandidates& candidates, std::size_t place) {
    std::vector<std::string> words;
    for (const auto axis : telling_axes(candidates)) {
        words.push_back(fmt::format("{} {}", short_name(candidates, axis), candidates.values[place][axis]));
    }
    return words.empty() ? "the only setting" : joined(words, ", ");
}

// The best `most` of the ranking among the front, and the pick; by rising false per minute.
std::vector<std::size_t> shown_places(const TuneOutcome& outcome, double limit, std::size_t most) {
    std::vector<std::size_t> places;
    const auto on_front = [&](std::size_t place) {
        return std::find(outcome.confirmed_front.begin(), outcome.confirmed_front.end(), place) !=
               outcome.confirmed_front.end();
    };
    for (const auto i : ranking(outcome.confirmed, limit)) {
        if (on_front(outcome.confirmed_at[i])) {
            places.push_back(outcome.confirmed_at[i]);
        }
    }
    for (const auto place : outcome.confirmed_front) {
        if (std::find(places.begin(), places.end(), place) == places.end()) {
            places.push_back(place);
        }
    }
    places.resize(std::min(places.size(), most));
    if (outcome.picked && std::find(places.begin(), places.end(), *outcome.picked) == places.end()) {
        places.push_back(*outcome.picked);
    }
    std::stable_sort(places.begin(), places.end(), [&](std::size_t a, std::size_t b) {
        return outcome.confirmed_of(a)->training.false_per_minute < outcome.confirmed_of(b)->training.false_per_minute;
    });
    return places;
}

constexpr std::string_view part_head = "hits/of     hit % false/min median   p90"; // of columns_of

} // namespace

std::string front_summary(const TuneCandidates& candidates, const TuneOutcome& outcome, double max_false_per_minute,
                          std::size_t most) {
    const auto telling = telling_axes(candidates);
    std::string keys, rows;
    for (const auto axis : telling) {
        keys += fmt::format(" {:>5}", short_name(candidates, axis));
    }
    for (const auto place : shown_places(outcome, max_false_per_minute, most)) {
        rows += place == outcome.picked ? '*' : ' ';
        for (const auto axis : telling) {
            const auto width = std::max<std::size_t>(5, short_name(candidates, axis).size());
            rows += fmt::format(" {:>{}}", candidates.values[place][axis], width);
        }
        const auto& result = *outcome.confirmed_of(place);
        rows += fmt::format(" | {} | {}\n", columns_of(result.training), columns_of(result.held_out));
    }
    const auto within = ranking(outcome.swept, max_false_per_minute).size();
    auto text = fmt::format("{} of {} settings at {} false per minute or fewer on the training parts, without pulses\n",
                            within, outcome.swept.size(), max_false_per_minute);
    text += fmt::format("{} on the front there; {} run by the whole engine, {} of them on their front",
                        outcome.front.size(), outcome.confirmed.size(), outcome.confirmed_front.size());
    text += fmt::format("{}\n", outcome.confirmed_front.empty() ? "" : ":");
    if (rows.empty()) {
        return text;
    }
    const std::string blank(keys.size(), ' ');
    text += fmt::format(" {} | {:<{}} | held out\n", blank, "training", part_head.size());
    text += fmt::format(" {} | {} | {}\n", keys, part_head, part_head);
    return text + rows;
}

std::string pick_sentence(const TuneCandidates& candidates, const TuneOutcome& outcome, double max_false_per_minute) {
    const auto& picked = *outcome.confirmed_of(*outcome.picked);
    const auto ranked = ranking(outcome.confirmed, max_false_per_minute);
    auto sentence = fmt::format("picked {}, because of the {} confirmed settings at {} false per minute or fewer on "
                                "the training parts it finds "
                                "most ripples there ({:.1f} % at {:.2f} false per minute, {:.1f} ms after their onset)",
                                named(candidates, *outcome.picked), ranked.size(), max_false_per_minute,
                                100.0 * picked.training.hit_rate().share, picked.training.false_per_minute,
                                picked.training.latency_median_ms);
    if (outcome.passed_over > 0) {
        sentence += fmt::format(" once {} ranked before it {} left out, above the limit on the held-out parts",
                                outcome.passed_over, outcome.passed_over == 1 ? "is" : "are");
    }
    if (ranked.size() > outcome.passed_over + 1) {
        const auto& next = outcome.confirmed[ranked[outcome.passed_over + 1]].training;
        sentence += fmt::format("; the next best finds {:.1f} % at {:.2f} false per minute, {:.1f} ms after onset",
                                100.0 * next.hit_rate().share, next.false_per_minute, next.latency_median_ms);
    }
    return sentence + ".\n";
}

std::string doubts(const SweepResult& picked, double max_false_per_minute) {
    constexpr double wide = 0.10;      // of a Wilson interval, from end to end
    constexpr double few_false = 10.0; // a count of 10 is known to about a third
    std::string text;
    const auto look_at = [&](const char* name, const PartFigures& part) {
        const auto rate = part.hit_rate();
        if (!(rate.high - rate.low <= wide)) {
            text +=
                fmt::format("few labels  {}: {} ripples leave the hit rate anywhere from {} to {} % (95 % interval, "
                            "{} points wide)\n",
                            name, part.ripples, figure(100.0 * rate.low, 1), figure(100.0 * rate.high, 1),
                            figure(100.0 * (rate.high - rate.low), 0));
        }
        if (part.eligible_minutes * max_false_per_minute < few_false) {
            text += fmt::format("few minutes {}: in {:.1f} eligible minutes {} per minute are {:.1f} false detections; "
                                "a rate from so few is rough\n",
                                name, part.eligible_minutes, max_false_per_minute,
                                part.eligible_minutes * max_false_per_minute);
        }
    };
    look_at("training", picked.training);
    look_at("held out", picked.held_out);
    return text;
}

std::string sweep_table(const TuneCandidates& candidates, const TuneOutcome& outcome) {
    auto text = key_names(candidates) + "\tdelay_ms\tfront\tpicked";
    for (const auto* part : {"training", "held_out", "confirmed_training", "confirmed_held_out"}) {
        text += cell_names(part);
    }
    const auto not_run = std::string("\tn/a\tn/a\tn/a\tn/a\tn/a\tn/a");
    for (std::size_t i = 0; i < outcome.swept.size(); ++i) {
        const bool on_front = std::find(outcome.front.begin(), outcome.front.end(), i) != outcome.front.end();
        const auto* confirmed = outcome.confirmed_of(i);
        text += fmt::format("\n{}\t{:.2f}\t{}\t{}\t{}\t{}", joined(candidates.values[i], "\t"),
                            outcome.swept[i].delay_ms, on_front ? 1 : 0, outcome.picked == i ? 1 : 0,
                            cells_of(outcome.swept[i].training), cells_of(outcome.swept[i].held_out));
        text += confirmed == nullptr
                    ? not_run + not_run
                    : fmt::format("\t{}\t{}", cells_of(confirmed->training), cells_of(confirmed->held_out));
    }
    return text + "\n";
}

std::string curve_table(const TuneCandidates& candidates, const TuneOutcome& outcome) {
    auto text = "training_hit_rate_low\ttraining_hit_rate_high\theld_out_hit_rate_low\theld_out_hit_rate_high" +
                cell_names("training") + cell_names("held_out") + "\t" + key_names(candidates);
    for (const auto place : outcome.front) {
        const auto& result = outcome.swept[place];
        const auto training = result.training.hit_rate(), held_out = result.held_out.hit_rate();
        text += fmt::format("\n{}\t{}\t{}\t{}\t{}\t{}\t{}", figure(training.low, 4), figure(training.high, 4),
                            figure(held_out.low, 4), figure(held_out.high, 4), cells_of(result.training),
                            cells_of(result.held_out), joined(candidates.values[place], "\t"));
    }
    return text + "\n";
}

} // namespace millpond
