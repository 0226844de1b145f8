#include "referee/agreement.hpp"

#include <algorithm>
#include <optional>

namespace millpond {
namespace {

// Finds partners for events that come by onset; a list may hold long events that reach past later ones.
class Partners {
  public:
    explicit Partners(const Ripples& list) : list_(list) {}

    [[nodiscard]] const Ripple* of(const Ripple& event) {
        while (first_ < list_.size() && list_[first_].end < event.onset) {
            ++first_;
        }
        const Ripple* best = nullptr;
        std::uint64_t most = 0;
        for (std::size_t i = first_; i < list_.size() && list_[i].onset <= event.end; ++i) {
            const auto from = std::max(event.onset, list_[i].onset), to = std::min(event.end, list_[i].end);
            if (from <= to && to - from + 1 > most) {
                most = to - from + 1;
                best = &list_[i];
            }
        }
        return best;
    }

  private:
    const Ripples& list_;
    std::size_t first_ = 0;
};

double ms_between(SampleIndex from, SampleIndex to, Hertz rate) noexcept {
    return (static_cast<double>(to.value) - static_cast<double>(from.value)) * 1000.0 / rate.value;
}

bool has_end(const RippleList& list, const Ripple& ripple) noexcept {
    return !list.by_person || ripple.end > ripple.onset;
}

SideOfPair side_of(const std::vector<RippleList>& lists, std::size_t of, std::size_t with, Hertz rate) {
    Partners partners(lists[with].ripples);
    std::vector<double> onsets, ends;
    for (const auto& event : lists[of].ripples) {
        if (const Ripple* partner = partners.of(event)) {
            onsets.push_back(ms_between(event.onset, partner->onset, rate));
            if (has_end(lists[of], event) && has_end(lists[with], *partner)) {
                ends.push_back(ms_between(event.end, partner->end, rate));
            }
        }
    }
    const auto shared = proportion(onsets.size(), lists[of].ripples.size());
    return {of, with, shared, distribution(std::move(onsets)), distribution(std::move(ends))};
}

} // namespace

const SideOfPair& Agreement::side(std::size_t of, std::size_t with) const {
    return *std::find_if(sides.begin(), sides.end(),
                         [&](const SideOfPair& side) { return side.of == of && side.with == with; });
}

Agreement agreement_of(std::vector<RippleList> lists, const Intervals& excluded, Hertz rate) {
    Agreement agreement{std::move(lists), 0, excluded, {}};
    for (auto& list : agreement.lists) {
        agreement.left_out += std::erase_if(
            list.ripples, [&](const Ripple& ripple) { return touches(excluded, ripple.onset, ripple.end); });
    }
    for (std::size_t of = 0; of < agreement.lists.size(); ++of) {
        for (std::size_t with = 0; with < agreement.lists.size(); ++with) {
            if (of != with) {
                agreement.sides.push_back(side_of(agreement.lists, of, with, rate));
            }
        }
    }
    return agreement;
}

Intervals union_of(const Intervals& a, const Intervals& b) {
    Intervals all;
    std::merge(a.begin(), a.end(), b.begin(), b.end(), std::back_inserter(all),
               [](const Interval& x, const Interval& y) { return x.from < y.from; });
    Intervals joined;
    for (const auto& each : all) {
        if (!joined.empty() && joined.back().to >= each.from) {
            joined.back().to = std::max(joined.back().to, each.to);
        } else {
            joined.push_back(each);
        }
    }
    return joined;
}

} // namespace millpond
