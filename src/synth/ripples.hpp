// Ripples with their sharp waves, and the truth about them.
#pragma once

#include "base/random.hpp"
#include "synth/states.hpp"

#include <algorithm>
#include <limits>

namespace millpond {

/// One ripple as it was made. Its envelope rises from nothing to its peak and falls to nothing as sin^2 (two halves of
/// a Hann window). `onset` is the first frame in which it exceeds a tenth of the planned peak, `end` the last one; a
/// pulse that cuts the ripple short moves `end` (and `peak`, if it came before it), never `onset`.
struct RippleTruth {
    SampleIndex onset;
    SampleIndex peak; ///< frame of the largest envelope
    SampleIndex end;
    double amplitude_uv; ///< largest envelope, on the site where ripples are largest
    double frequency_hz; ///< at the planned peak
    bool cut;            ///< cut short by a pulse
};

class RippleTrain : public SceneElement {
  public:
    RippleTrain(const SceneSettings& settings, std::vector<ChannelGains> gains, std::shared_ptr<const States> states);
    void add(SampleIndex at, std::span<double> frame) override;

    /// A ripple whose interval [onset, end] holds `now` falls to nothing from `delay_ms` later, within `fall_ms`.
    /// Call before the frame `now` is made. Does nothing between ripples.
    void cut(SampleIndex now, double delay_ms, double fall_ms);

    /// Ripples that are over, in order. Grows with the recording: some 50 bytes a ripple.
    [[nodiscard]] const std::vector<RippleTruth>& truth() const noexcept { return truth_; }

  private:
    struct Ripple {
        double begin_s, onset_s, peak_s, end_s, stop_s; ///< begin and stop: envelope 0; onset and end: a tenth
        double sharp_begin_s, sharp_stop_s;
        double amplitude_uv, sharp_wave_uv;
        double peak_hz, hz_per_s, phase_turns;
        double cut_s = std::numeric_limits<double>::infinity();
        double fall_s = 0.0;
        double depth_um = 0.0; ///< below the layer's middle, where it is largest
        double largest = 0.0;  ///< envelope so far, as a share of the planned peak
        RippleTruth truth{};

        [[nodiscard]] double first_s() const noexcept { return std::min(begin_s, sharp_begin_s); }
        [[nodiscard]] double last_s() const noexcept {
            return std::min(std::max(stop_s, sharp_stop_s), cut_s + fall_s);
        }
        [[nodiscard]] double envelope(double t) const noexcept;
        [[nodiscard]] double cut_gain(double t) const noexcept;
    };

    void draw_next(double not_before_s);
    [[nodiscard]] double draw_onset(double not_before_s);
    [[nodiscard]] double mean_wait_s() const;
    /// Size of a ripple on a channel, as a share of its size where it is largest.
    [[nodiscard]] double share(const Ripple& ripple, std::size_t channel) const noexcept;
    void add_one(Ripple& ripple, SampleIndex at, std::span<double> frame) const;

    RippleSettings ripples_;
    SharpWaveSettings sharp_wave_;
    Hertz rate_;
    double duration_s_;
    std::vector<ChannelGains> gains_;
    std::shared_ptr<const States> states_;
    double ripples_in_run_;
    double mean_wait_s_ = 0.0;
    Random random_, more_;
    Ripple next_{};
    std::vector<Ripple> active_;
    std::vector<RippleTruth> truth_;
};

} // namespace millpond
