// Second-order sections one after the other over one signal, for what lies beside the kernel. Thread: one owner.
#pragma once

#include "detector/bandpass_design.hpp"

#include <array>
#include <utility>
#include <vector>

namespace millpond {

/// Transposed direct form, the kernel's own operations in their order. After it is made nothing here allocates.
class SectionCascade {
  public:
    SectionCascade() = default;
    explicit SectionCascade(std::vector<Section> sections)
        : sections_(std::move(sections)), states_(sections_.size()) {}

    double next(double value) noexcept {
        for (std::size_t i = 0; i < sections_.size(); ++i) {
            const auto& section = sections_[i];
            auto& state = states_[i];
            const double out = section.b0 * value + state[0];
            state[0] = (section.b1 * value + state[1]) - section.a1 * out;
            state[1] = section.b2 * value - section.a2 * out;
            value = out;
        }
        return value;
    }

    void clear() noexcept {
        for (auto& state : states_) {
            state = {0.0, 0.0};
        }
    }

  private:
    std::vector<Section> sections_;
    std::vector<std::array<double, 2>> states_;
};

} // namespace millpond
