#include "synth/faults.hpp"

namespace millpond {

GainDrift::GainDrift(const SceneSettings& settings, std::size_t channels)
    : log_sd_(settings.gain_drift.log_sd), rate_{settings.rate_hz} {
    for (std::size_t i = 0; i < channels; ++i) {
        wander_.emplace_back(Random(settings.seed, number_of(RandomStream::gain_drift, i)),
                             settings.gain_drift.period_s);
    }
}

void GainDrift::add(SampleIndex at, std::span<double> frame) {
    const double t = seconds_at(at, rate_);
    for (std::size_t i = 0; i < frame.size(); ++i) {
        frame[i] *= portable_exp(log_sd_ * wander_[i].at(t));
    }
}

Faults::Faults(const SceneSettings& settings)
    : faults_(settings.faults), rate_{settings.rate_hz}, random_(settings.seed, number_of(RandomStream::faults)) {
    if (faults_.dead_site > 0) {
        happenings_.push_back({0.0, settings.duration_s, HappeningKind::dead});
    }
    if (faults_.failing_site > 0) {
        happenings_.push_back({faults_.failing_at_s, settings.duration_s, HappeningKind::dead});
    }
}

double Faults::shown(FaultKind kind) noexcept {
    switch (kind) {
    case FaultKind::railed:
        return faults_.rail_uv;
    case FaultKind::huge:
        return faults_.huge_uv * random_.normal();
    case FaultKind::flat:
        break;
    }
    return 0.0;
}

void Faults::add(SampleIndex at, std::span<double> frame) {
    if (faults_.dead_site > 0) {
        frame[static_cast<std::size_t>(faults_.dead_site - 1)] = shown(faults_.dead_kind);
    }
    if (faults_.failing_site > 0 && seconds_at(at, rate_) >= faults_.failing_at_s) {
        frame[static_cast<std::size_t>(faults_.failing_site - 1)] = shown(faults_.failing_kind);
    }
}

} // namespace millpond
