// A line that a library drives for us. The library stands behind a small table, so that tests can put a line there that
// no computer needs to have.
#pragma once

#include "outputs/output.hpp"
#include "outputs/output_settings.hpp"

#include <atomic>
#include <vector>

namespace millpond {

/// `level` is the line's own, after `inverted`.
struct LineLibrary {
    /// Opens the device and makes the line an output at `level`. Throws Refusal. Thread: control.
    void* (*open)(const OutputSettings& settings, bool level);
    /// Thread: as Output::set_line.
    bool (*write)(void* line, bool level) noexcept;
    /// Thread: control.
    bool (*answers)(void* line) noexcept;
    /// Thread: control.
    void (*close)(void* line) noexcept;
};

class LibraryLineOutput : public Output {
  public:
    /// Refuses as the library's `open` does.
    LibraryLineOutput(const OutputSettings& settings, const LineLibrary& library);
    ~LibraryLineOutput() override;

    bool set_line(bool high) noexcept override;
    bool answers() noexcept override;
    bool reopen() noexcept override;

  private:
    OutputSettings settings_;
    LineLibrary library_;
    std::atomic<void*> line_;
    std::vector<void*> lost_; // kept open to the end: somebody may be in the middle of an order
};

} // namespace millpond
