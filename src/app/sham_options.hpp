// What the commands under `sham` have in common: whose rate and limits, compared with what, written where. Thread:
// cold.
#pragma once

#include "app/sham_source.hpp"
#include "settings/settings.hpp"
#include "sham/schedule_report.hpp"

#include <filesystem>
#include <memory>
#include <optional>
#include <string>

namespace CLI {
class App;
} // namespace CLI

namespace millpond {

class ShamOptions {
  public:
    /// --settings, or else --sampling-hz and limits one by one.
    void add_limits(CLI::App& command);
    /// --ripples, or else --ripple-rate-per-s and --ripple-mean-ms; `whose` says in which time the table is.
    void add_ripples(CLI::App& command, const std::string& whose);
    /// --out and --overwrite.
    void add_out(CLI::App& command);

    /// The session that the schedule is made from or compared with; before rate() and limits(), which it may settle.
    void take_source(const std::filesystem::path& source);

    /// After take_source. Refuses where neither options nor settings nor a session say it.
    [[nodiscard]] Hertz rate() const;
    [[nodiscard]] ScheduleLimits limits() const;
    [[nodiscard]] const std::optional<ShamSource>& source() const noexcept { return source_; }
    /// Of --settings; empty without it.
    [[nodiscard]] const std::optional<Settings>& settings() const;
    [[nodiscard]] bool has_ripples() const noexcept { return !ripples_.empty(); }
    void take_ripples(const std::filesystem::path& table) { ripples_ = table; }

    /// The report on a schedule. Ripples of the table are moved with the source's moment to `start`.
    [[nodiscard]] std::string report(const Schedule& schedule, SampleIndex moment = {}, SampleIndex start = {}) const;

    /// Refuses a schedule without a place, one that breaks the limits, and a file that exists; writes; says where.
    [[nodiscard]] std::string write(const MadeSchedule& made) const;

  private:
    [[nodiscard]] std::optional<Hertz> said_rate() const;
    [[nodiscard]] std::filesystem::path out() const;

    std::string settings_file_;
    std::optional<double> sampling_hz_, lockout_ms_;
    std::optional<std::uint32_t> max_pulses_per_second_, max_pulses_per_minute_, max_pulses_per_session_;
    std::filesystem::path ripples_, out_;
    std::optional<double> ripple_rate_per_s_, ripple_mean_ms_;
    bool overwrite_ = false;
    std::optional<ShamSource> source_;
    mutable std::optional<Settings> settings_; // once they were asked for
};

} // namespace millpond
