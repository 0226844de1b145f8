#include "detector/evidence_calibration.hpp"

#include "base/refusal.hpp"

#include <algorithm>
#include <cmath>

namespace millpond {

double threshold_for(const EvidenceSettings& evidence, const std::string& where) {
    const auto& points = evidence.calibration;
    if (points.size() < 2) {
        throw Refusal(where + ".calibration", std::to_string(points.size()) + " points", "at least two");
    }
    for (std::size_t i = 1; i < points.size(); ++i) {
        if (points[i].deviations <= points[i - 1].deviations || points[i].per_minute >= points[i - 1].per_minute) {
            throw Refusal(where + ".calibration[" + std::to_string(i) + "]", "a point out of order",
                          "deviations that rise and per_minute that falls from point to point");
        }
    }
    std::size_t right = 1;
    while (right + 1 < points.size() && points[right].per_minute > evidence.false_per_minute) {
        ++right;
    }
    const auto& low = points[right - 1];
    const auto& high = points[right];
    const double share =
        std::log(evidence.false_per_minute / low.per_minute) / std::log(high.per_minute / low.per_minute);
    const double deviations = low.deviations + share * (high.deviations - low.deviations);
    // Thousandths are finer than anyone can measure, and take the last bits of the logarithm away.
    return std::max(std::nearbyint(deviations * 1000.0) / 1000.0, 0.1);
}

} // namespace millpond
