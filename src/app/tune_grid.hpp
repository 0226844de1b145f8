// The grid of a sweep: which keys of the detector take which values. Thread: cold. Bad values throw Refusal.
//
// From YAML in the shape of a settings file, any key below `detector` with a list of values (or a single one):
//
//     detector:
//       filter: {low_hz: [130, 150], order: [1, 2]}
//       threshold: {deviations: [3, 4, 5, 6]}
//
// Keys that are not there stay as in the settings that the sweep starts from.
#pragma once

#include "detector/detector_settings.hpp"

#include <yaml-cpp/yaml.h>

#include <filesystem>
#include <string>
#include <vector>

namespace millpond {

class TuneGrid {
  public:
    /// Reads and checks every value, each on its own. Refuses unknown keys (with the nearest that is known), values out
    /// of range, the same value twice, and keys that no sweep over recordings can judge.
    static TuneGrid from_file(const std::filesystem::path& file);
    static TuneGrid from_text(const std::string& yaml, const std::string& source);

    /// Takes the other's axes in. Refuses a key that both have.
    void add(TuneGrid other);

    struct Axis {
        std::string key;                 ///< `filter.low_hz`
        std::vector<std::string> values; ///< as written
    };
    /// Of both sources, in the order in which the settings tell their keys: what is cheap to change comes last.
    [[nodiscard]] std::vector<Axis> axes() const;

    /// Sets the axes to values of these places. Other keys of `detector` stay.
    void apply(const std::vector<std::size_t>& places, DetectorSettings& detector) const;

  private:
    struct Leaf {
        std::string key;
        std::vector<YAML::Node> values;
        std::size_t order = 0; ///< among all keys of the detector
        std::size_t source = 0;
    };
    struct Source {
        std::string name;
        YAML::Node root;
    };
    void read_group(const YAML::Node& group, const std::string& path);
    void check_each();
    void set(const Leaf& leaf, const YAML::Node& value) const;

    std::vector<Source> sources_;
    std::vector<Leaf> leaves_; // by order
};

struct TuneCandidates {
    std::vector<TuneGrid::Axis> axes;
    std::vector<DetectorSettings> settings;
    std::vector<std::vector<std::string>> values; ///< of each setting: one word for each axis
    std::size_t left_out = 0;                     ///< combinations that are none: edges or levels the wrong way round
};

/// Every combination on top of `base`, the last axis innermost. Left out are bands with low_hz at or above high_hz,
/// and re-arm levels above their threshold where the grid names both; where it does not, the re-arm level stays as in
/// `base`, but never above the threshold.
[[nodiscard]] TuneCandidates candidates_of(const TuneGrid& grid, const DetectorSettings& base);

} // namespace millpond
