// What the evidence looks at before anything was learned from the user's own recordings.
#include "detector/evidence_settings.hpp"

namespace millpond {

std::vector<FeatureSettings> EvidenceSettings::default_features() {
    return {
        {"sites", 150.0, 250.0, 1, 10.0, 1.0},  {"sites", 320.0, 560.0, 2, 10.0, -0.9},
        {"sites", 260.0, 400.0, 2, 10.0, -0.4}, {"sites", 100.0, 140.0, 1, 10.0, -0.35},
        {"sites", 60.0, 100.0, 1, 10.0, -0.07},
    };
}

std::vector<CalibrationPoint> EvidenceSettings::default_calibration() {
    return {{4.0, 10.0}, {6.0, 1.0}};
}

} // namespace millpond
