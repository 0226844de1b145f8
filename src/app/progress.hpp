// A line on standard error for whatever takes longer than two seconds: how far, and how long still. Thread: one.
#pragma once

#include <chrono>
#include <string>

namespace millpond {

class Progress {
  public:
    /// `total`: what `at` counts up to; 0 where it is not known.
    Progress(std::string what, double total);
    Progress(const Progress&) = delete;
    Progress& operator=(const Progress&) = delete;
    /// Ends the line, where there is one.
    ~Progress();

    /// Prints now and then, not at every call.
    void at(double done);

  private:
    using Clock = std::chrono::steady_clock;

    std::string what_;
    double total_;
    bool terminal_;
    bool printed_ = false;
    Clock::time_point start_, next_print_;
};

} // namespace millpond
