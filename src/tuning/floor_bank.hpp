// The rule of both methods for many settings at once: their floors, thresholds, votes, vetoes. Thread: one.
#pragma once

#include "base/channels.hpp"
#include "tuning/envelope_pass.hpp"
#include "tuning/floor_batch.hpp"

namespace millpond {

class FloorBank : public CrossingRule {
  public:
    /// Settings whose passes are shared (EnvelopePass::shared_by).
    FloorBank(std::span<const DetectorSettings> settings, const Channels& channels, Hertz rate,
              const EnvelopePass& pass);

    void gap(SampleIndex resumes_at) noexcept override;
    void take(SampleIndex first, std::span<const double> statistics, std::size_t values) override;
    [[nodiscard]] std::vector<Detections> detections() override;

  private:
    struct Batch {
        std::vector<std::size_t> of; ///< places of its settings
        FloorBatch floors;
    };
    std::vector<Batch> batches_;
    std::vector<std::size_t> columns_;                 // of the pass that are compared: voting ones, then references
    std::vector<double> envelopes_, highest_, lowest_; // as in EnvelopeBlock
    std::size_t settings_ = 0;
};

} // namespace millpond
