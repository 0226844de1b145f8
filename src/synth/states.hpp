// When the animal rests and when it runs: the whole recording's plan, drawn before its first frame.
#pragma once

#include "base/random.hpp"
#include "synth/scene_element.hpp"

#include <memory>

namespace millpond {

class States {
  public:
    struct Epoch {
        double onset_s, end_s;
        AnimalState state;
    };

    explicit States(const SceneSettings& settings);

    /// False where the settings know no states; then all is as in rest, and theta goes on too.
    [[nodiscard]] bool change() const noexcept { return !epochs_.empty(); }
    /// In order, without gaps, from 0 to beyond the recording's end.
    [[nodiscard]] const std::vector<Epoch>& epochs() const noexcept { return epochs_; }

    [[nodiscard]] std::vector<Happening> happenings() const;

    [[nodiscard]] bool runs_at(double t) const noexcept;
    /// Shares of theta and of delta in the signal, 0 to 1: one rises as the other falls.
    [[nodiscard]] double theta_at(double t) const noexcept;
    [[nodiscard]] double delta_at(double t) const noexcept;

  private:
    [[nodiscard]] const Epoch& epoch_at(double t) const noexcept;
    /// 0 in rest, 1 in running; it changes evenly in the first `change_s` of a state.
    [[nodiscard]] double running_at(double t) const noexcept;

    double change_s_;
    std::vector<Epoch> epochs_;
};

} // namespace millpond
