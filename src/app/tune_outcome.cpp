#include "app/tune_outcome.hpp"

#include <algorithm>

namespace millpond {

const SweepResult* TuneOutcome::confirmed_of(std::size_t place) const noexcept {
    const auto found = std::lower_bound(confirmed_at.begin(), confirmed_at.end(), place);
    return found == confirmed_at.end() || *found != place
               ? nullptr
               : &confirmed[static_cast<std::size_t>(found - confirmed_at.begin())];
}

TuneOutcome outcome_of(const SweepResults& swept, const SweepResults& confirmed, double max_false_per_minute) {
    TuneOutcome outcome;
    for (std::size_t i = 0; i < swept.size(); ++i) {
        outcome.swept.push_back(*swept[i]);
        if (i < confirmed.size() && confirmed[i]) {
            outcome.confirmed_at.push_back(i);
            outcome.confirmed.push_back(*confirmed[i]);
        }
    }
    outcome.front = front(outcome.swept);
    for (const auto i : front(outcome.confirmed)) {
        outcome.confirmed_front.push_back(outcome.confirmed_at[i]);
    }
    if (const auto picked = pick(outcome.confirmed, max_false_per_minute)) {
        outcome.picked = outcome.confirmed_at[picked->index];
        outcome.passed_over = picked->passed_over;
    }
    return outcome;
}

std::vector<std::size_t> next_to_confirm(const TuneOutcome& outcome, double max_false_per_minute) {
    const auto first = finalists(outcome.swept, max_false_per_minute, finalist_count);
    std::vector<std::size_t> next;
    std::copy_if(first.begin(), first.end(), std::back_inserter(next),
                 [&](std::size_t place) { return outcome.confirmed_of(place) == nullptr; });
    if (!next.empty() || outcome.picked) {
        return next;
    }
    for (const auto place : ranking(outcome.swept, max_false_per_minute)) {
        if (outcome.confirmed_of(place) == nullptr && next.size() < finalist_count) {
            next.push_back(place);
        }
    }
    return next;
}

} // namespace millpond
