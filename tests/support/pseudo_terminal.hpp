// A serial cable without hardware: a pseudo-terminal under a name of the test's choice. Thread: test.
#pragma once

#include <cstdlib>
#include <fcntl.h>
#include <filesystem>
#include <stdexcept>
#include <string>
#include <termios.h>
#include <unistd.h>

namespace millpond::test {

class PseudoTerminal {
  public:
    /// The other end can be opened as `name`.
    explicit PseudoTerminal(std::filesystem::path name) : name_(std::move(name)) { plug_in(); }
    ~PseudoTerminal() { unplug(); }
    PseudoTerminal(const PseudoTerminal&) = delete;
    PseudoTerminal& operator=(const PseudoTerminal&) = delete;

    void plug_in() {
        end_ = ::posix_openpt(O_RDWR | O_NOCTTY | O_CLOEXEC | O_NONBLOCK);
        if (end_ < 0 || ::grantpt(end_) != 0 || ::unlockpt(end_) != 0) {
            throw std::runtime_error("no pseudo-terminal");
        }
        // Raw from the start: whoever opens it later must not find his own words echoed.
        termios raw{};
        ::tcgetattr(end_, &raw);
        ::cfmakeraw(&raw);
        ::tcsetattr(end_, TCSANOW, &raw);
        std::filesystem::remove(name_);
        std::filesystem::create_symlink(::ptsname(end_), name_);
    }
    /// As a cable that is pulled: the device is gone, and so is its name.
    void unplug() {
        if (end_ >= 0) {
            ::close(end_);
            end_ = -1;
            std::filesystem::remove(name_);
        }
    }

    /// This end, open.
    [[nodiscard]] int end() const { return end_; }
    [[nodiscard]] std::string name() const { return name_.string(); }

  private:
    std::filesystem::path name_;
    int end_ = -1;
};

} // namespace millpond::test
