// Charge of a stimulus and what is published about its harm. Warns and records; permits nothing and holds up nothing:
// what is allowed stands in the approved protocol. Thread: cold.
//
// Shannon's line: log10 D = k - log10 Q, D charge density in uC/cm2 and Q charge in uC, both of one phase; damage was
// seen from k = 1.85 (Shannon 1992, IEEE Trans Biomed Eng 39:424). It was drawn from surface discs of 1 mm2 and more,
// 50 pulses a second for hours, and does not hold for microelectrodes (Cogan et al. 2016, review): there it is a mark
// on a scale, not a limit. Published commissural pulses exceed 30 uC/cm2, a rule of thumb, 10 to 60 fold.
#pragma once

#include "stimulus/stimulus_settings.hpp"

#include <optional>
#include <string>
#include <vector>

namespace millpond {

/// From where on damage was seen.
inline constexpr double shannon_k_of_damage = 1.85;
/// Rule of thumb for charge density (from memory), uC/cm2.
inline constexpr double density_rule_uc_cm2 = 30.0;

struct StimulusFigures {
    double charge_uc = 0.0; ///< per phase
    double area_um2 = 0.0;
    double density_uc_cm2 = 0.0; ///< per phase
    double shannon_k = 0.0;      ///< log10 (density * charge)
    bool biphasic = true;
};

/// Empty where nothing is described. Refuses a current without an electrode; `where` names the settings.
[[nodiscard]] std::optional<StimulusFigures> stimulus_figures(const StimulusSettings& settings,
                                                              const std::string& where = "stimulus");

/// What there is to warn of, one line each; never empty: the last one says who permits.
[[nodiscard]] std::vector<std::string> stimulus_warnings(const StimulusFigures& figures);

/// "0.05 uC a phase, 1768 uC/cm2 on 2827 um2, Shannon k 1.95".
[[nodiscard]] std::string told(const StimulusFigures& figures);

} // namespace millpond
