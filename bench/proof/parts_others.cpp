#include "proof/clairvoyant.hpp"
#include "proof/cost.hpp"
#include "proof/outside.hpp"
#include "proof/parts.hpp"
#include "proof/second_opinion.hpp"

#include <fmt/format.h>

namespace millpond::bench {
namespace {

constexpr double floor_reaches = 0.87; // of the ripples put in
constexpr std::array<double, 6> floor_rates{10.0, 3.0, 1.0, 0.5, 0.3, 0.1};

// Both halves of the background, each judged by what was learned on the other; thresholds are in deviations, so that
// one ladder serves both.
Curve of_both_halves(const Outside& outside, const ProofSize& size, std::size_t repeats, double scale,
                     Learned& learned) {
    const double half_s = 0.5 * static_cast<double>(outside.once.size()) / outside.rate.value;
    Curve both;
    for (const auto& each : {turned(outside), outside}) {
        learned = learn_ours_in_blocks(injected(each, first_training_seed, size.training_seeds, repeats, scale),
                                       usual_features(sites_mix), half_s);
        const auto curve =
            curve_of(learned.detector, injected(each, first_test_seed, size.test_seeds, repeats, scale), {half_s});
        if (both.empty()) {
            both = curve;
            continue;
        }
        for (std::size_t k = 0; k < both.size(); ++k) {
            for (std::size_t i = 0; i < both[k].by_recording.size(); ++i) {
                both[k].by_recording[i] += curve[k].by_recording[i];
            }
        }
    }
    return both;
}

void say_untouched(Report& report, const Outside& outside, const std::string& name, const DetectorSettings& settings) {
    ProofRecording untouched{outside.channels, outside.rate, outside.once, {}, {}, {}};
    std::string times;
    const auto found = detections_of(settings, untouched);
    for (const auto at : found) {
        times += fmt::format(" {:.2f}", seconds_at(at, outside.rate));
    }
    report.say(fmt::format("without any ripples, {}: {} detections{}{}", name, found.size(),
                           found.empty() ? "" : ", at s", times));
}

} // namespace

void prove_outside(Report& report, const std::string& recording, const ProofSize& size) {
    if (recording.empty()) {
        report.say("\noutside recording: left out; give one by --background FILE");
        return;
    }
    const double began = now_s();
    const auto outside = load_outside(recording);
    const auto repeats = std::max<std::size_t>(
        1, static_cast<std::size_t>(
               size.minutes * 60.0 * outside.rate.value / static_cast<double>(outside.once.size()) + 0.5));
    const double scale = scale_for(outside, first_training_seed, repeats, floor_reaches);
    const auto training = injected(outside, first_training_seed, size.training_seeds, repeats, scale);
    const auto test = injected(outside, first_test_seed, size.test_seeds, repeats, scale);
    report.begin("outside", outside.rate);
    report.say(fmt::format("\n{}, first channel, {:.0f} s, with ripples put in, median peak {:.0f} uV ({:.2f} of a "
                           "scene's): {} recordings, each {} times through it, seeds {} to {}",
                           outside.name, static_cast<double>(outside.once.size()) / outside.rate.value,
                           RippleSettings{}.amplitude_uv * scale, scale, size.test_seeds, repeats, first_test_seed,
                           first_test_seed + size.test_seeds - 1));
    report.say("textbook and two bands were chosen on this whole background, ours learned on one half of it and is "
               "judged on the other, both ways; false detections repeat with the background, so that their rate comes "
               "in steps of about one a time through it");
    report.head();
    const auto textbook = choose_textbook(training, size.grid);
    textbook_rows(report, textbook, test);
    report.rows("two bands", curve_of(choose_two_bands(training), test));
    Learned learned;
    report.rows("ours", of_both_halves(outside, size, repeats, scale, learned));
    report.rows("ours, defaults", curve_of(unlearned(), test));
    asked_and_got(report, "ours, defaults", unlearned(), test);
    report.rows("floor", outside_floor(outside, test, floor_rates));
    report.say(fmt::format("textbook at 1.0: {}", textbook.best[1].name()));
    say_untouched(report, outside, "ours, defaults, asked for 1 a minute", unlearned());
    say_untouched(report, outside, "ours, learned on its first half, asked for 1 a minute", learned.detector);
    say_untouched(report, outside, "textbook, its default settings", textbook_chain());
    report.say(fmt::format("all {:.0f} s", now_s() - began));
}

void prove_cost(Report& report, const ProofSize& size) {
    auto textbook = textbook_chain();
    textbook.filter.order = 2;
    auto ours = unlearned();
    ours.evidence.features = usual_features(learned_mix);
    ours.evidence.mixes = {{std::string(learned_mix), {}, {}}};
    const double share = size.grid == Grid::full ? 1.0 : 0.2;
    report.say(fmt::format("\ncost of a frame in the whole engine, {} features against the textbook chain of order 2",
                           ours.evidence.features.size()));
    for (const auto& [sites, reference, rate, seconds] :
         {std::tuple{4, true, 1250.0, 400.0}, std::tuple{16, false, 30000.0, 10.0}}) {
        const auto cost =
            cost_of(textbook, ours, static_cast<std::size_t>(sites), reference, Hertz{rate}, seconds * share);
        report.say(fmt::format("{:>2} sites{}, {:>6.0f} Hz: ours {:6.1f} ns, textbook {:6.1f} ns, ratio {:.2f}", sites,
                               reference ? " + reference" : "            ", rate, cost.ours_ns, cost.textbook_ns,
                               cost.ratio()));
    }
}

void prove_by_scipy(Report& report, const ProofSize& size) {
    const auto test = invented(SceneName::typical, first_test_seed, 1, size.minutes * 30.0, Split::whole);
    report.say(
        "\nthe textbook chain by ours and by bench/scipy_textbook.py, typical scene, same samples, same settings");
    for (const auto rule : {VoteRule::mean, VoteRule::count}) {
        for (const auto method : {EnvelopeMethod::rectify, EnvelopeMethod::analytic}) {
            auto settings = textbook_chain();
            settings.filter.order = method == EnvelopeMethod::analytic ? 1 : 2;
            settings.envelope.method = method;
            settings.vote = {rule, rule == VoteRule::count ? 2 : 1};
            settings = with_threshold(settings, 5.0);
            const auto& recording = test.front();
            const auto ours = detections_of(settings, recording);
            const auto theirs = scipy_textbook(settings, recording.channels, recording.rate, recording.data);
            const Intervals all{{SampleIndex{0}, SampleIndex{recording.frames()}}};
            report.say(fmt::format(
                "{:<8} order {}, {:<5}: ours {} detections, {:.1f} % found; SciPy's {}, {:.1f} %; {} at the same "
                "sample, {} within two",
                word_for<EnvelopeMethod>(envelope_methods, method), settings.filter.order,
                word_for<VoteRule>(vote_rules, rule), ours.size(), 100.0 * counts_of(recording, ours, all).hit_rate(),
                theirs.size(), 100.0 * counts_of(recording, theirs, all).hit_rate(), shared(ours, theirs, 0),
                shared(ours, theirs, 2)));
        }
    }
}

} // namespace millpond::bench
