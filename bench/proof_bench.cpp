// How early and how sure are detections, beside the textbook chain at its best and the floor of what can be known?
// Usage: proof_bench [--quick] [--background FILE] [--curves FILE.tsv]   tools/proof runs it and draws its curves
// Settings are learned and chosen on scenes of seeds 901, 902, ...; every figure is of seeds 1001, 1002, ..., which
// nothing was ever tuned on. FILE: a recording without ripples, its first channel; else rat_hippocampus_60s.wav of the
// folder that MILLPOND_RECORDINGS names, where there is one.
#include "base/clock.hpp"
#include "base/refusal.hpp"
#include "proof/clairvoyant.hpp"
#include "proof/parts.hpp"
#include "recording/whole_file.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

namespace {

using namespace millpond;
using namespace millpond::bench;

struct Options {
    bool quick = false;
    std::string background, curves;
    std::vector<std::string> parts;

    [[nodiscard]] bool wants(std::string_view part) const {
        return parts.empty() || std::find(parts.begin(), parts.end(), part) != parts.end();
    }
};

std::string background_of(const Options& options) {
    const char* folder = std::getenv("MILLPOND_RECORDINGS");
    return !options.background.empty() || folder == nullptr
               ? options.background
               : (std::filesystem::path(folder) / "rat_hippocampus_60s.wav").string();
}

void prove(const Options& options) {
    const double began = now_s();
    check_whitener();
    Report report;
    const auto size = options.quick ? quick_size : full_size;
    for (const auto& [scene, word] : scene_names) {
        if (options.wants(word)) {
            prove_scene(report, scene, size);
        }
    }
    if (options.wants("outside")) {
        prove_outside(report, background_of(options), size);
    }
    if (options.wants("cost")) {
        prove_cost(report, size);
    }
    if (options.wants("scipy")) {
        prove_by_scipy(report, size);
    }
    if (!options.curves.empty()) {
        write_whole_file(options.curves, report.curves());
    }
    report.say(fmt::format("\nall of it took {:.0f} s on {} processors", now_s() - began, processors()));
}

} // namespace

int main(int argc, char** argv) {
    CLI::App program("How early and how sure are detections, beside the textbook chain and the clairvoyant floor?");
    Options options;
    program.add_flag("--quick", options.quick, "a coarse look at short scenes");
    program.add_option("--background", options.background, "recording to put ripples into, its first channel");
    program.add_option("--curves", options.curves, "tab-separated file for the curves");
    program.add_option("--parts", options.parts, "only these of quiet, typical, hard, running, outside, cost, scipy");
    CLI11_PARSE(program, argc, argv);
    try {
        prove(options);
    } catch (const Refusal& refusal) {
        fmt::print(stderr, "proof_bench: {}\n", refusal.what());
        return 2;
    }
}
