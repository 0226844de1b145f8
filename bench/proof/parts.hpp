// The parts of the proof, each with its own lines in the report. Thread: cold.
#pragma once

#include "proof/detectors.hpp"
#include "proof/report.hpp"

namespace millpond::bench {

struct ProofSize {
    std::size_t training_seeds, test_seeds;
    double minutes; ///< of each recording
    Grid grid;      ///< of the textbook's settings
};
inline constexpr ProofSize full_size{4, 8, 10.0, Grid::full};
inline constexpr ProofSize quick_size{2, 2, 2.0, Grid::coarse};

inline constexpr std::uint64_t first_training_seed = 901, first_test_seed = 1001;

void prove_scene(Report& report, SceneName scene, const ProofSize& size);
/// Says that it is left out where `recording` is not there.
void prove_outside(Report& report, const std::string& recording, const ProofSize& size);
void prove_cost(Report& report, const ProofSize& size);
void prove_by_scipy(Report& report, const ProofSize& size);

/// By this computer's clock.
[[nodiscard]] double now_s();

/// At each of asked_false_per_minute the setting chosen for it, and the quick one at 1.
void textbook_rows(Report& report, const TextbookChoice& textbook, const std::vector<ProofRecording>& test);

/// A threshold that a user gets by asking for a false rate: one row for each of asked_false_per_minute.
void asked_and_got(Report& report, const std::string& name, DetectorSettings settings,
                   const std::vector<ProofRecording>& test);

} // namespace millpond::bench
