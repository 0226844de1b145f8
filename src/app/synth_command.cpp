// millpond synth: an invented recording with known ripples, its sidecar and its truth.
#include "app/commands.hpp"
#include "app/described_options.hpp"
#include "app/progress.hpp"
#include "base/refusal.hpp"
#include "recording/events_table.hpp"
#include "recording/recording_writer.hpp"
#include "settings/yaml_reader.hpp"
#include "synth/named_scenes.hpp"
#include "synth/scene.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdio>

namespace millpond {
namespace {

/// Below the examples.
const std::string truth_help =
    "Truth (RECORDING.truth.tsv), one row an event, in order of onset:\n"
    "  onset, duration   seconds from the first sample; a ripple lasts while its envelope exceeds a tenth of its peak\n"
    "  trial_type        ripple; rest, run: states; gamma; spikes: a burst, spike: one alone; step; muscle; dead: a "
    "site\n"
    "  sample            frame of the onset\n"
    "  peak_sample, end_sample, amplitude_uv, frequency_hz\n"
    "                    ripples only: frame of the peak and of the end; envelope and frequency at the peak, the "
    "former\n"
    "                    on the site where it is largest, before any drift of gain";

struct StorageSettings {
    Encoding encoding = Encoding::int16;
    double microvolts_per_count = 0.2;
};

template <class Visitor> void describe(Visitor& visit, StorageSettings& storage) {
    visit.choice("encoding", storage.encoding, encodings, "how samples are stored");
    visit.number("microvolts_per_count", storage.microvolts_per_count, {1e-6, 1e6}, "scale of integer samples");
}

struct SynthRequest {
    std::string recording;
    std::string scene;
    bool overwrite = false;
    DescribedOptions scene_options;
    DescribedOptions storage_options;
};

void refuse_existing(const std::filesystem::path& file) {
    if (std::filesystem::exists(file)) {
        throw Refusal(file.string(), "a file that exists", "a new name, or --overwrite");
    }
}

TableEvent event_of(const RippleTruth& ripple, Hertz rate) {
    TableEvent event;
    event.onset_s = seconds_at(ripple.onset, rate);
    event.duration_s = static_cast<double>(ripple.end - ripple.onset) / rate.value;
    event.trial_type = "ripple";
    event.sample = static_cast<std::int64_t>(ripple.onset.value);
    event.extra = {{"peak_sample", std::to_string(ripple.peak.value)},
                   {"end_sample", std::to_string(ripple.end.value)},
                   {"amplitude_uv", fmt::format("{:.2f}", ripple.amplitude_uv)},
                   {"frequency_hz", fmt::format("{:.2f}", ripple.frequency_hz)}};
    return event;
}

/// States and artefacts, so that a gate or a false detection can be looked up.
TableEvent event_of(const Happening& happening, const Scene& scene) {
    const double last_s = static_cast<double>(scene.frames()) / scene.rate().value;
    TableEvent event;
    event.onset_s = happening.onset_s;
    event.duration_s = std::min(happening.end_s, last_s) - happening.onset_s;
    event.trial_type = word_for<HappeningKind>(happening_kinds, happening.kind);
    event.sample = static_cast<std::int64_t>(std::ceil(happening.onset_s * scene.rate().value));
    return event;
}

void write_truth(const std::filesystem::path& file, const Scene& scene) {
    std::vector<TableEvent> events;
    for (const auto& ripple : scene.truth()) {
        events.push_back(event_of(ripple, scene.rate()));
    }
    const double last_s = static_cast<double>(scene.frames()) / scene.rate().value;
    for (const auto& happening : scene.happenings()) {
        if (happening.onset_s < last_s) {
            events.push_back(event_of(happening, scene));
        }
    }
    write_events_table(file, std::move(events), {"peak_sample", "end_sample", "amplitude_uv", "frequency_hz"});
}

void write_samples(RecordingWriter& writer, Scene& scene) {
    std::vector<float> frames(4096 * scene.channels().size());
    Progress progress("synth", static_cast<double>(scene.frames()));
    while (const auto made = scene.next(frames)) {
        writer.write(std::span(frames).first(made * scene.channels().size()));
        progress.at(static_cast<double>(writer.frames()));
    }
}

/// A name comes before a file of that name.
SceneSettings scene_called(const std::string& scene) {
    if (scene.empty()) {
        return {};
    }
    const auto* named = std::find_if(std::begin(scene_names), std::end(scene_names),
                                     [&](const auto& choice) { return choice.word == scene; });
    if (named != std::end(scene_names)) {
        return named_scene(named->value);
    }
    if (!std::filesystem::exists(scene)) {
        throw Refusal("command line: --scene", "'" + scene + "', which is no file",
                      "quiet, typical, hard, running, or a file with settings of a scene");
    }
    return read_yaml_file<SceneSettings>(scene);
}

void run_synth(const SynthRequest& request) {
    const std::filesystem::path recording = request.recording;
    auto settings = scene_called(request.scene);
    request.scene_options.apply(settings);
    StorageSettings storage;
    request.storage_options.apply(storage);
    if (!request.overwrite) {
        for (const auto& file : {recording, sidecar_path(recording), truth_path(recording)}) {
            refuse_existing(file);
        }
    }
    auto scene = Scene::make(settings, request.scene.empty() ? "command line" : request.scene);
    RecordingWriter writer(recording,
                           {container_for(recording), storage.encoding, storage.microvolts_per_count, WriteMode::whole},
                           scene.channels(), scene.rate(), request.overwrite);
    write_samples(writer, scene);
    write_truth(truth_path(recording), scene);
    writer.finish();
    fmt::print("recording\t{}\nsidecar\t{}\ntruth\t{}\nframes\t{}\nripples\t{}\n", recording.string(),
               sidecar_path(recording).string(), truth_path(recording).string(), writer.frames(), scene.truth().size());
    if (writer.clipped() > 0) {
        fmt::print(stderr,
                   "synth: {} samples were beyond the range of the encoding and were clipped; raise "
                   "--microvolts-per-count\n",
                   writer.clipped());
    }
}

} // namespace

void add_synth_command(CLI::App& program) {
    auto* command = program.add_subcommand(
        "synth", "make an invented recording with known ripples, its sidecar and a table of the truth");
    const auto request = std::make_shared<SynthRequest>();
    command->add_option("RECORDING", request->recording, "file to make: .wav, .rf64, .w64, .flac or .raw")->required();
    command->add_option(
        "--scene", request->scene,
        "quiet, typical, hard or running, or a file with settings of a scene (YAML); options override it");
    command->add_flag("--overwrite", request->overwrite, "replace a recording of that name");
    request->storage_options.declare(*command, StorageSettings{});
    request->scene_options.declare(*command, SceneSettings{});
    add_example(
        *command,
        "build/millpond synth rest.flac --duration-s 120 --sites 4 --reference --rate-hz 1250 --seed 1\n"
        "  build/millpond synth hard.rf64 --scene hard --seed 2 --faults-failing-site 3 --encoding float32\n\n" +
            truth_help);
    command->callback([request] { run_synth(*request); });
}

} // namespace millpond
