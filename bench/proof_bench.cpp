// How early and how sure are detections, beside the textbook chain at its best and the floor of what can be known?
// Usage: proof_bench [--quick] [--background FILE] [--curves FILE.tsv]   tools/proof runs it and draws its curves
// Settings are learned and chosen on scenes of seeds 901, 902, ...; every figure is of seeds 1001, 1002, ..., which
// nothing was ever tuned on. FILE: a recording without ripples, its first channel; else rat_hippocampus_60s.wav of the
// folder that MILLPOND_RECORDINGS names, where there is one.
#include "proof/clairvoyant.hpp"
#include "proof/detectors.hpp"
#include "proof/report.hpp"

#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "recording/whole_file.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

namespace {

using namespace millpond;
using namespace millpond::bench;

constexpr std::uint64_t first_training_seed = 901, first_test_seed = 1001;

struct Size {
    std::size_t training_seeds = 4, test_seeds = 8;
    double minutes = 10.0;
    Grid grid = Grid::full;
};

double now_s() {
    return static_cast<double>(monotonic_now().count()) / 1e9;
}

std::vector<double> floor_rates() {
    return {10.0, 5.0, 3.0, 2.0, 1.0, 0.5, 0.3, 0.2, 0.1};
}

double ripples_in(const std::vector<ProofRecording>& recordings) {
    double count = 0.0;
    for (const auto& recording : recordings) {
        count += static_cast<double>(recording.truth.size());
    }
    return count;
}

void asked_and_got(Report& report, DetectorSettings settings, const std::vector<ProofRecording>& test,
                   const std::string& name) {
    for (const double asked : asked_false_per_minute) {
        settings.evidence.false_per_minute = asked;
        const auto point = run_as_is(settings, test);
        report.row(name, fmt::format("ask {:.1f}", asked), figures_of(point, test.front().rate));
    }
}

void prove_scene(Report& report, SceneName scene, const Size& size) {
    const double began = now_s();
    const auto name = std::string(word_for<SceneName>(scene_names, scene));
    const auto training =
        invented(scene, first_training_seed, size.training_seeds, size.minutes * 60.0, Split::whole);
    const auto test = invented(scene, first_test_seed, size.test_seeds, size.minutes * 60.0, Split::in_parts);
    report.begin(name);
    const auto sites = test.front().channels.size();
    report.say(fmt::format("\n{}: {} seeds from {} of {} min, {} ripples; trained on {} seeds from {}; {}", name,
                           size.test_seeds, first_test_seed, size.minutes, ripples_in(test), size.training_seeds,
                           first_training_seed, sites == 1 ? "one site" : "four sites and a reference"));
    const auto textbook = choose_textbook(training, size.grid);
    const double chosen = now_s();
    const auto ours = learn_ours(training, usual_features(sites == 1 ? sites_mix : learned_mix));
    const double learned = now_s();
    report.head();
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        const auto curve = textbook_curve(textbook.best[k].settings, test);
        report.row("textbook", asked_false_per_minute[k], curve);
        if (asked_false_per_minute[k] == 1.0) {
            report.keep("textbook", curve);
        }
    }
    report.row("textbook, quick", 1.0, textbook_curve(textbook.quick.settings, test));
    report.rows("two bands", evidence_curve(choose_two_bands(training), test));
    report.rows("ours", evidence_curve(ours.detector, test));
    asked_and_got(report, ours.detector, test, "ours");
    DetectorSettings defaults;
    defaults.method = DetectionMethod::evidence;
    report.rows("ours, defaults", evidence_curve(defaults, test));
    asked_and_got(report, defaults, test, "ours, defaults");
    report.rows("floor", clairvoyant_floor(test, floor_rates()));
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        report.say(fmt::format("textbook at {:.1f}: {}", asked_false_per_minute[k], textbook.best[k].name()));
    }
    report.say(fmt::format("textbook, quick: {}", textbook.quick.name()));
    for (const auto& feature : ours.detector.evidence.features) {
        report.say(fmt::format("ours: {:>7.3f} x {}-{} Hz, order {}, {} ms", feature.weight, feature.low_hz,
                               feature.high_hz, feature.order, feature.smoothing_ms));
    }
    report.say(fmt::format("{} textbook settings in {:.0f} s, learning {:.0f} s, all {:.0f} s", textbook.tried,
                           chosen - began, learned - chosen, now_s() - began));
}

} // namespace

int main(int argc, char** argv) {
    CLI::App program("How early and how sure are detections, beside the textbook chain and the clairvoyant floor?");
    bool quick = false;
    std::string background, curves;
    std::vector<std::string> scenes;
    program.add_flag("--quick", quick, "a coarse look in well under a minute");
    program.add_option("--background", background, "recording without ripples to put ripples into, its first channel");
    program.add_option("--curves", curves, "tab-separated file for the curves");
    program.add_option("--scenes", scenes, "only these scenes");
    CLI11_PARSE(program, argc, argv);
    try {
        const double began = now_s();
        Report report(Hertz{1250.0});
        const Size size = quick ? Size{2, 2, 3.0, Grid::coarse} : Size{};
        for (const auto& [scene, word] : scene_names) {
            if (scenes.empty() || std::find(scenes.begin(), scenes.end(), word) != scenes.end()) {
                prove_scene(report, scene, size);
            }
        }
        if (!curves.empty()) {
            write_whole_file(curves, report.curves());
        }
        report.say(fmt::format("\nall of it took {:.0f} s", now_s() - began));
    } catch (const Refusal& refusal) {
        fmt::print(stderr, "{}\n", refusal.what());
        return 2;
    }
}
