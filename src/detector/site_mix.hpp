// Weighted sums of channels, and new weights without the sites that died. Thread: made in control, solved in the loop.
// Private to this room.
//
// A learned mix is the minimum-variance one for its pattern a and the background's covariance C: w ~ inv(C) a, scaled
// to the background power that the settings' own weights give (Capon 1969; the leading generalised eigenvector is the
// same mix, with a = C w, Haufe et al. 2014; both from memory). Without some sites the same formula runs over the rest.
#pragma once

#include "base/channels.hpp"
#include "detector/evidence_settings.hpp"

#include <cstddef>
#include <string>
#include <vector>

namespace millpond {

class SiteMixes {
  public:
    /// `inputs`: roles of the looked-at channels in stream order. Refuses mixes that do not fit them, `where` naming
    /// the settings.
    static SiteMixes make(const EvidenceSettings& settings, std::vector<ChannelRole> inputs, const std::string& where);

    [[nodiscard]] std::size_t count() const noexcept { return mixes_.size(); }
    /// Place of the mix of that name; `count()` where there is none.
    [[nodiscard]] std::size_t place_of(std::string_view name) const noexcept;
    /// The mix takes anything at all: that of references does not where there are none.
    [[nodiscard]] bool takes_something(std::size_t mix) const noexcept;

    /// Writes the mix's weights, one an input, with what is not `alive` left out. Allocates and throws nothing.
    void weights(std::size_t mix, const std::vector<bool>& alive, double* out) noexcept;

  private:
    struct Mix {
        MixSettings settings;
        bool built_in = false;
        double power = 0.0; ///< of the background in the mix as given, uV^2
    };

    void mean_over_alive(const Mix& mix, const std::vector<bool>& alive, double* out) const noexcept;
    bool solve(const Mix& mix, const std::vector<bool>& alive, double* out) noexcept;
    [[nodiscard]] double covariance(std::size_t a, std::size_t b) const noexcept;

    std::vector<ChannelRole> inputs_;
    std::vector<double> background_;
    std::vector<Mix> mixes_;
    std::vector<double> factor_;   // room for a Cholesky factor
    std::vector<double> solution_; // and its right side
    std::vector<std::size_t> kept_;
    std::size_t kept_count_ = 0;
};

} // namespace millpond
