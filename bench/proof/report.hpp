// The proof bench's table on standard output, and its curves in a tab-separated file. Thread: one.
#pragma once

#include "proof/figures.hpp"

namespace millpond::bench {

class Report {
  public:
    /// What follows is of this scene.
    void begin(const std::string& scene, Hertz rate);
    void say(const std::string& sentence) const;
    void head() const;
    /// One row at each of asked_false_per_minute, and the curve's points for the picture.
    void rows(const std::string& detector, const Curve& curve);
    void row(const std::string& detector, double asked, const Curve& curve) const;
    void row(const std::string& detector, const std::string& asked, const Figures& figures) const;
    void keep(const std::string& detector, const Curve& curve);
    [[nodiscard]] const std::string& curves() const noexcept { return curves_; }

  private:
    Hertz rate_;
    std::string scene_;
    std::string curves_ = "scene\tdetector\tthreshold\tfalse_per_minute\tfound\tlatency_median_ms\tlatency_p90_ms\n";
};

} // namespace millpond::bench
