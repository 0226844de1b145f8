// A sweep's results as they come, so that one that was stopped goes on, and parts of one are put together. Thread: one.
//
// Tab-separated text: lines that say what the work belongs to, then one line for each result. Numbers are written so
// that they are read back to the same bits. A last line that was cut is left out.
#pragma once

#include "tuning/sweep.hpp"

#include <cstddef>
#include <filesystem>
#include <string>

namespace millpond {

/// What results depend on; a work file serves one of these.
struct WorkIdentity {
    std::string program;    ///< its version
    std::string recordings; ///< checksum of samples, channels and rate
    std::string truth;      ///< checksum of the ripples
    std::string settings;   ///< checksum of all candidates and of the plan
    std::size_t candidates = 0;
};

/// One of several parts of a sweep: the settings from the first up to, not including, the last, in grid order.
struct SweepPart {
    std::size_t number = 1, of = 1;

    [[nodiscard]] std::size_t first(std::size_t candidates) const noexcept { return (number - 1) * candidates / of; }
    [[nodiscard]] std::size_t last(std::size_t candidates) const noexcept { return number * candidates / of; }
};

enum class SweepStage : std::uint8_t {
    swept,    ///< without pulses
    confirmed ///< by the whole engine
};

class WorkFile {
  public:
    /// An empty one in place of what is there. Refuses a place that cannot be written.
    static WorkFile begin(const std::filesystem::path& file, const WorkIdentity& identity, SweepPart part);
    /// One that is there, as it is. Refuses one that belongs to other work, saying to what.
    static WorkFile read(const std::filesystem::path& file, const WorkIdentity& identity, SweepPart part);
    /// The same, to go on with.
    static WorkFile resume(const std::filesystem::path& file, const WorkIdentity& identity, SweepPart part);

    /// Written through to the system at once. Refuses a full disk.
    void keep(SweepStage stage, std::size_t place, const SweepResult& result);

    [[nodiscard]] const SweepResults& swept() const noexcept { return swept_; }
    [[nodiscard]] const SweepResults& confirmed() const noexcept { return confirmed_; }

  private:
    WorkFile(std::filesystem::path file, std::size_t candidates);
    void write(const std::string& text, bool anew);
    void take_line(const std::string& line);

    std::filesystem::path file_;
    SweepResults swept_, confirmed_;
};

/// Name of the work file beside `out`, or of a part's.
[[nodiscard]] std::filesystem::path work_path(const std::filesystem::path& out);
[[nodiscard]] std::filesystem::path work_path(const std::filesystem::path& out, SweepPart part);

/// Puts together all parts beside `out`. Refuses missing parts, unfinished ones and those of other work.
[[nodiscard]] SweepResults merge_parts(const std::filesystem::path& out, const WorkIdentity& identity);

} // namespace millpond
