#include "base/clock.hpp"
#include "proof/clairvoyant.hpp"
#include "proof/parts.hpp"

#include <fmt/format.h>

namespace millpond::bench {
namespace {

constexpr std::array<double, 9> floor_rates{10.0, 5.0, 3.0, 2.0, 1.0, 0.5, 0.3, 0.2, 0.1};

std::size_t ripples_in(const std::vector<ProofRecording>& recordings) {
    std::size_t count = 0;
    for (const auto& recording : recordings) {
        count += recording.truth.size();
    }
    return count;
}

void say_settings(Report& report, const TextbookChoice& textbook, const DetectorSettings& ours) {
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        report.say(fmt::format("textbook at {:.1f}: {}", asked_false_per_minute[k], textbook.best[k].name()));
    }
    report.say(fmt::format("textbook, quick: {}", textbook.quick.name()));
    for (const auto& feature : ours.evidence.features) {
        report.say(fmt::format("ours: {:>7.3f} x {} {}-{} Hz, order {}, {} ms", feature.weight, feature.mix,
                               feature.low_hz, feature.high_hz, feature.order, feature.smoothing_ms));
    }
}

} // namespace

void textbook_rows(Report& report, const TextbookChoice& textbook, const std::vector<ProofRecording>& test) {
    for (std::size_t k = 0; k < asked_false_per_minute.size(); ++k) {
        const auto curve = curve_of(textbook.best[k].settings, test);
        report.row("textbook", asked_false_per_minute[k], curve);
        if (asked_false_per_minute[k] == 1.0) {
            report.keep("textbook", curve);
        }
    }
    report.row("textbook, quick", 1.0, curve_of(textbook.quick.settings, test));
}

double now_s() {
    return static_cast<double>(monotonic_now().count()) / 1e9;
}

void asked_and_got(Report& report, const std::string& name, DetectorSettings settings,
                   const std::vector<ProofRecording>& test) {
    for (const double asked : asked_false_per_minute) {
        settings.evidence.false_per_minute = asked;
        const auto point = run_as_is(settings, test);
        report.row(name, fmt::format("ask {:.1f}", asked), figures_of(point, test.front().rate));
    }
}

void prove_scene(Report& report, SceneName scene, const ProofSize& size) {
    const double began = now_s();
    const auto name = std::string(word_for<SceneName>(scene_names, scene));
    const auto training = invented(scene, first_training_seed, size.training_seeds, size.minutes * 60.0, Split::whole);
    const auto test = invented(scene, first_test_seed, size.test_seeds, size.minutes * 60.0, Split::in_parts);
    const bool one_site = test.front().channels.size() == 1;
    report.begin(name, test.front().rate);
    report.say(fmt::format("\n{}, {}: {} recordings of {:.0f} min, seeds {} to {}, {} ripples; trained on {}, seeds "
                           "{} to {}",
                           name, one_site ? "one site" : "four sites and a reference", size.test_seeds, size.minutes,
                           first_test_seed, first_test_seed + size.test_seeds - 1, ripples_in(test),
                           size.training_seeds, first_training_seed, first_training_seed + size.training_seeds - 1));
    const auto textbook = choose_textbook(training, size.grid);
    const double chosen = now_s();
    const auto ours = learn_ours(training, usual_features(one_site ? sites_mix : learned_mix));
    const double learned = now_s();
    report.head();
    textbook_rows(report, textbook, test);
    report.rows("two bands", curve_of(choose_two_bands(training), test));
    report.rows("ours", curve_of(ours.detector, test));
    asked_and_got(report, "ours", ours.detector, test);
    report.rows("ours, defaults", curve_of(unlearned(), test));
    asked_and_got(report, "ours, defaults", unlearned(), test);
    report.rows("floor", clairvoyant_floor(test, floor_rates));
    say_settings(report, textbook, ours.detector);
    report.say(fmt::format("{} textbook settings in {:.0f} s, learning {:.0f} s, all {:.0f} s", textbook.tried,
                           chosen - began, learned - chosen, now_s() - began));
}

} // namespace millpond::bench
