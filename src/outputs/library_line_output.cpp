#include "outputs/library_line_output.hpp"

#include <exception>

namespace millpond {

LibraryLineOutput::LibraryLineOutput(const OutputSettings& settings, const LineLibrary& library)
    : settings_(settings), library_(library), line_(library.open(settings, settings.inverted)) {}

LibraryLineOutput::~LibraryLineOutput() {
    for (void* line : lost_) {
        library_.close(line);
    }
    library_.close(line_.load(std::memory_order_relaxed));
}

bool LibraryLineOutput::set_line(bool high) noexcept {
    // Acquired: a line put here by `reopen` is whole.
    return library_.write(line_.load(std::memory_order_acquire), high != settings_.inverted);
}

bool LibraryLineOutput::answers() noexcept {
    return library_.answers(line_.load(std::memory_order_relaxed));
}

bool LibraryLineOutput::reopen() noexcept {
    try {
        lost_.reserve(lost_.size() + 1);
        void* found = library_.open(settings_, settings_.inverted);
        lost_.push_back(line_.exchange(found, std::memory_order_acq_rel));
        return set_line(false);
    } catch (const std::exception&) {
        return false; // still not there
    }
}

} // namespace millpond
