#include "app/sham_options.hpp"

#include "app/from_settings.hpp"
#include "app/truth.hpp"
#include "base/refusal.hpp"
#include "intake/stream_settings.hpp"
#include "journal/session_reader.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

namespace millpond {
namespace {

// Ripples of a source, seen from the stream that plays its schedule: those before it begins are left out.
Ripples moved(const Ripples& ripples, SampleIndex moment, SampleIndex start) {
    Ripples there;
    for (const auto& ripple : ripples) {
        if (ripple.onset + start.value >= moment) {
            there.push_back({SampleIndex{ripple.onset.value + start.value - moment.value},
                             SampleIndex{ripple.peak.value + start.value - moment.value},
                             SampleIndex{ripple.end.value + start.value - moment.value}, ripple.peak_envelope});
        }
    }
    return there;
}

} // namespace

void ShamOptions::add_limits(CLI::App& command) {
    auto* settings = command.add_option("--settings", settings_file_,
                                        "settings file of the session that will play it: its rate and its limits, so "
                                        "that no number can contradict it");
    const auto add = [&](const char* name, auto& value, const char* help, auto range) {
        command.add_option(name, value, help)->check(range)->excludes(settings);
    };
    add("--sampling-hz", sampling_hz_,
        "frames a second of the stream that will play it; a session folder says it itself", CLI::Range(1.0, 1e6));
    add("--lockout-ms", lockout_ms_,
        "lock-out of the session that will play it; a schedule that breaks it is refused\n"
        "(else that of the source, where it is a session folder, else 150)",
        CLI::Range(0.0, 60000.0));
    add("--max-pulses-per-second", max_pulses_per_second_, "likewise (else 4)", CLI::Range(1U, 1000U));
    add("--max-pulses-per-minute", max_pulses_per_minute_, "likewise (else 120)", CLI::Range(1U, 60000U));
    add("--max-pulses-per-session", max_pulses_per_session_, "likewise (else 10000)", CLI::Range(1U, 10'000'000U));
}

void ShamOptions::add_ripples(CLI::App& command, const std::string& whose) {
    auto* table = command.add_option("--ripples", ripples_,
                                     "events table with the ripples " + whose +
                                         ": says how many places lie in them, and how many\n"
                                         "would by chance; `audit --out` writes one (ripples.tsv)");
    auto* rate = command
                     .add_option("--ripple-rate-per-s", ripple_rate_per_s_,
                                 "ripples a second of the animal that will have the pulses, for the share by chance")
                     ->check(CLI::Range(1e-6, 100.0))
                     ->excludes(table);
    auto* mean = command.add_option("--ripple-mean-ms", ripple_mean_ms_, "their mean duration")
                     ->check(CLI::Range(0.1, 10000.0))
                     ->needs(rate);
    rate->needs(mean);
}

void ShamOptions::add_out(CLI::App& command) {
    command.add_option("--out", out_,
                       "schedule to write: an events table with trial_type scheduled\n"
                       "(else arbiter.schedule_file of --settings)");
    command.add_flag("--overwrite", overwrite_, "replace it where it exists");
}

const std::optional<Settings>& ShamOptions::settings() const {
    if (!settings_ && !settings_file_.empty()) {
        settings_ = load_settings(settings_file_);
    }
    return settings_;
}

std::optional<Hertz> ShamOptions::said_rate() const {
    if (settings()) {
        return Hertz{resolved(settings()->stream, settings_file_).rate_hz};
    }
    return sampling_hz_ ? std::optional(Hertz{*sampling_hz_}) : std::nullopt;
}

void ShamOptions::take_source(const std::filesystem::path& source) {
    source_ = read_sham_source(source, said_rate(),
                               settings_file_.empty() ? "--sampling-hz" : settings_file_ + ": stream.rate_hz");
}

Hertz ShamOptions::rate() const {
    if (const auto said = said_rate()) {
        return *said;
    }
    if (!source_) {
        throw Refusal("--sampling-hz", "nothing",
                      "the rate of the stream that will play the schedule, or --settings with the file that says it");
    }
    return source_->rate;
}

ScheduleLimits ShamOptions::limits() const {
    if (settings()) {
        return limits_of(settings()->arbiter);
    }
    ScheduleLimits limits;
    const bool all_given = lockout_ms_ && max_pulses_per_second_ && max_pulses_per_minute_ && max_pulses_per_session_;
    if (source_ && source_->session && !all_given) {
        limits = limits_of(load_settings(SessionReader(source_->name).settings_file()).arbiter);
    }
    limits.lockout_ms = lockout_ms_.value_or(limits.lockout_ms);
    limits.max_pulses_per_second = max_pulses_per_second_.value_or(limits.max_pulses_per_second);
    limits.max_pulses_per_minute = max_pulses_per_minute_.value_or(limits.max_pulses_per_minute);
    limits.max_pulses_per_session = max_pulses_per_session_.value_or(limits.max_pulses_per_session);
    return limits;
}

std::string ShamOptions::report(const Schedule& schedule, SampleIndex moment, SampleIndex start) const {
    ReportInput with;
    if (source_) {
        with.source = source_->places;
        with.source_name = source_->name;
    }
    if (!ripples_.empty()) {
        with.ripples = moved(ripples_from_table(ripples_, rate(), UINT64_MAX), moment, start);
        with.ripple_time = ripple_time(*with.ripples, rate(), ripples_.string());
    } else if (ripple_rate_per_s_) {
        with.ripple_time = RippleTime{*ripple_rate_per_s_, *ripple_mean_ms_, "as given"};
    }
    return told(report_on(schedule, limits(), with, rate()));
}

std::filesystem::path ShamOptions::out() const {
    if (!out_.empty()) {
        return out_;
    }
    if (!settings() || settings()->arbiter.schedule_file.empty()) {
        throw Refusal("--out", "nothing", "a file to write, or --settings with an arbiter.schedule_file");
    }
    return settings()->arbiter.schedule_file;
}

std::string ShamOptions::write(const MadeSchedule& made) const {
    const auto file = out();
    if (made.places.empty()) {
        throw Refusal(file.string(), "a schedule without a single place", "a longer duration or a higher rate");
    }
    check_schedule(made.places, limits(), rate(), file.string());
    if (!overwrite_ && std::filesystem::exists(file)) {
        throw Refusal(file.string(), "a file that exists", "a new name, or --overwrite");
    }
    write_schedule(file, made.places, rate());
    return fmt::format("{:<11} {} places, by {:.1f} ms at most\n{:<11} {}\n", "put off", made.put_off,
                       made.longest_put_off_ms, "schedule", file.string());
}

} // namespace millpond
