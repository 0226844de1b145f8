#include "stimulus/stimulus.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <cmath>
#include <numbers>

namespace millpond {
namespace {

constexpr double um2_in_cm2 = 1e8;
// Shannon's discs were this large and larger.
constexpr double least_area_of_shannon_um2 = 1e6;

double area_of(const StimulusSettings& settings) {
    if (settings.area_um2 > 0.0) {
        return settings.area_um2;
    }
    const double disc = std::numbers::pi * settings.diameter_um * settings.diameter_um / 4.0;
    switch (settings.shape) {
    case ElectrodeShape::hemisphere:
        return 2.0 * disc;
    case ElectrodeShape::cylinder:
        return disc + std::numbers::pi * settings.diameter_um * settings.length_um;
    default:
        return disc;
    }
}

} // namespace

std::optional<StimulusFigures> stimulus_figures(const StimulusSettings& settings, const std::string& where) {
    if (settings.current_ua <= 0.0) {
        return std::nullopt;
    }
    StimulusFigures figures;
    figures.area_um2 = area_of(settings);
    if (figures.area_um2 <= 0.0) {
        throw Refusal(where + ".area_um2", "a current without an electrode", "area_um2, or diameter_um and shape");
    }
    figures.charge_uc = settings.current_ua * settings.phase_us * 1e-6;
    figures.density_uc_cm2 = figures.charge_uc / (figures.area_um2 / um2_in_cm2);
    figures.shannon_k = std::log10(figures.density_uc_cm2 * figures.charge_uc);
    figures.biphasic = settings.phases == 2;
    return figures;
}

std::vector<std::string> stimulus_warnings(const StimulusFigures& figures) {
    std::vector<std::string> warnings;
    if (!figures.biphasic) {
        warnings.emplace_back("monophasic: charge is not taken back, which harms electrode and tissue more than the "
                              "figures say");
    }
    if (figures.density_uc_cm2 > density_rule_uc_cm2) {
        warnings.push_back(fmt::format(
            "{:.0f} times the rule of thumb of {:g} uC/cm2; published commissural pulses are 10 to 60 times",
            figures.density_uc_cm2 / density_rule_uc_cm2, density_rule_uc_cm2));
    }
    if (figures.shannon_k >= shannon_k_of_damage) {
        warnings.push_back(fmt::format("Shannon k {:.2f} is not below {:g}, from where on damage was seen",
                                       figures.shannon_k, shannon_k_of_damage));
    }
    if (figures.area_um2 < least_area_of_shannon_um2) {
        warnings.emplace_back("Shannon's line comes from discs of 1 mm2 and more and does not hold for electrodes as "
                              "small as this one: a low k is no sign of safety");
    }
    warnings.emplace_back("nothing here permits a stimulus: the approved protocol does; ask the licensed veterinarian");
    return warnings;
}

std::string told(const StimulusFigures& figures) {
    return fmt::format("{:.3g} uC a phase ({}), {:.4g} uC/cm2 on {:.4g} um2, Shannon k {:.2f}", figures.charge_uc,
                       figures.biphasic ? "biphasic" : "monophasic", figures.density_uc_cm2, figures.area_um2,
                       figures.shannon_k);
}

} // namespace millpond
