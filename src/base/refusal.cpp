#include "base/refusal.hpp"

#include <algorithm>
#include <numeric>

namespace millpond {
namespace {

// Levenshtein 1966: fewest insertions, deletions and replacements that turn one word into the other.
std::size_t edit_distance(std::string_view a, std::string_view b) {
    std::vector<std::size_t> row(b.size() + 1);
    std::iota(row.begin(), row.end(), std::size_t{0});
    for (std::size_t i = 1; i <= a.size(); ++i) {
        std::size_t diagonal = row[0];
        row[0] = i;
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t replaced = diagonal + (a[i - 1] == b[j - 1] ? 0 : 1);
            diagonal = row[j];
            row[j] = std::min({row[j] + 1, row[j - 1] + 1, replaced});
        }
    }
    return row.back();
}

} // namespace

Refusal::Refusal(std::string_view where, std::string_view found, std::string_view allowed)
    : line_(std::string(where) + ": found " + std::string(found) + "; allowed: " + std::string(allowed)) {}

std::string nearest_name(std::string_view found, const std::vector<std::string>& known) {
    std::string nearest;
    std::size_t best = std::max<std::size_t>(2, found.size() / 2) + 1;
    for (const auto& name : known) {
        const auto distance = edit_distance(found, name);
        if (distance < best) {
            best = distance;
            nearest = name;
        }
    }
    return nearest;
}

} // namespace millpond
