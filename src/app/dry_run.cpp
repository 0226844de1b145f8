#include "app/dry_run.hpp"

#include "app/agreement_run.hpp"
#include "app/from_settings.hpp"
#include "app/progress.hpp"
#include "app/truth.hpp"
#include "base/clock.hpp"
#include "recording/recording_reader.hpp"

#include <fmt/format.h>

#include <cstdio>

namespace millpond {
namespace {

void notice_rate(const Settings& settings, Hertz rate) {
    if (settings.stream.rate_hz > 0.0 && settings.stream.rate_hz != rate.value) {
        fmt::print(stderr, "note: the recording has {} Hz, the settings' stream {} Hz; the recording's rate is used\n",
                   rate.value, settings.stream.rate_hz);
    }
}

// One pass feeds the engine and whoever judges. Returns the time that the engine took.
Nanos run_over(RecordingReader& reader, std::size_t packet_frames, OfflineEngine& engine, Referee* referee,
               AgreementRun* agreement) {
    const auto& info = reader.info();
    Progress progress("dry run", static_cast<double>(info.frames));
    std::vector<float> buffer(std::max<std::size_t>(packet_frames, 4096) / packet_frames * packet_frames *
                              info.channels.size());
    SampleIndex at{0};
    Nanos engine_time{0};
    while (const std::size_t frames = reader.read(buffer)) {
        const FrameBlock block{at, info.channels.size(), std::span(buffer).first(frames * info.channels.size())};
        const auto before = monotonic_now();
        for (std::size_t from = 0; from < frames; from += packet_frames) {
            engine.process(block.part(from, std::min(packet_frames, frames - from)));
        }
        engine_time += monotonic_now() - before;
        if (referee != nullptr) {
            referee->add(block);
        }
        if (agreement != nullptr) {
            agreement->add(block);
        }
        at = at + frames;
        progress.at(static_cast<double>(at.value));
    }
    engine.finish();
    return engine_time;
}

void count_events(DryRun& run) {
    for (const auto& event : run.events) {
        if (event.kind == EventKind::withheld) {
            ++run.withheld[event.code];
        } else if (event.kind == EventKind::gap) {
            ++run.gaps;
            run.gap_frames += event.as<GapDetail>().frames;
        }
    }
}

} // namespace

DryRun dry_run(const DryRunPlan& plan) {
    const auto settings = load_settings(plan.settings);
    const auto reader = open_recording(plan.recording, plan.sidecar);
    DryRun run;
    run.recording = plan.recording.filename().string();
    run.format = reader->info().format;
    run.rate = reader->info().rate;
    run.frames = reader->info().frames;
    run.channels = channels_for(settings, reader->info().channels, plan.settings.string());
    run.settings_hash = settings_hash(settings, run.channels);
    run.armed = plan.armed;
    run.pulse_width_ms = pulse_output(settings).width_ms;
    notice_rate(settings, run.rate);
    if (settings.arbiter.speed_gate.on) {
        fmt::print(stderr, "note: a recording tells no speed; the speed gate is left out\n");
    }

    // The engine first: where a band does not fit the rate, the detector's is the one to name.
    auto engine = OfflineEngine::make({settings.detector, settings.arbiter}, run.channels, run.rate,
                                      schedule_for(settings.arbiter, run.rate), warm_start_floors(settings.detector));
    const auto judge = referee_settings_of(plan.referee);
    const std::string judge_name = plan.referee.empty() ? "referee" : plan.referee;
    std::optional<Referee> referee;
    std::optional<AgreementRun> agreement;
    if (plan.agreement) {
        agreement.emplace(judge, judge_name, run.channels, run.rate);
    }
    if (plan.labels.empty()) {
        run.referee_settings = judge;
        referee = Referee::make(judge, run.channels, run.rate, judge_name);
        run.truth = "referee";
    } else {
        run.findings.ripples = ripples_from_table(plan.labels, run.rate, run.frames, plan.label_reading);
        run.truth = plan.labels.filename().string();
    }
    engine.start(plan.armed);
    const auto took =
        run_over(*reader, plan.packet_frames, engine, referee ? &*referee : nullptr, agreement ? &*agreement : nullptr);
    run.real_pace = seconds_at(SampleIndex{run.frames}, run.rate) / std::chrono::duration<double>(took).count();
    run.events = engine.events();
    run.orders = engine.orders();
    run.filter_delay_ms = engine.detector().filter_delay_samples() * 1000.0 / run.rate.value;
    run.delay_ms = engine.detector().delay_samples() * 1000.0 / run.rate.value;
    count_events(run);
    if (referee) {
        run.findings = referee->finish();
    }
    const auto eligible = without(engine.eligible(), run.findings.artefacts.excluded);
    run.score = score(run.findings.ripples, detections_to_score(run.events), eligible, referee ? referee_early_ms : 0.0,
                      run.rate);
    if (agreement) {
        run.agreement = agreement->finish(referee ? std::nullopt
                                                  : std::optional(RippleList{run.truth, run.findings.ripples, true}));
    }
    return run;
}

} // namespace millpond
