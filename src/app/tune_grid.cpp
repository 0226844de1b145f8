#include "app/tune_grid.hpp"

#include "base/refusal.hpp"
#include "settings/yaml_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <map>
#include <set>

namespace millpond {
namespace {

/// What a grid file may hold.
struct GridFile {
    DetectorSettings detector;
};
template <class Visitor> void describe(Visitor& visit, GridFile& grid) {
    visit.group("detector", grid.detector, "keys of the detector");
}

// Dotted keys in the order of `describe`.
class KeyLister {
  public:
    std::vector<std::string> keys;

    void number(std::string_view key, double&, Range, std::string_view) { add(key); }
    template <class Whole> void whole(std::string_view key, Whole&, Range, std::string_view) { add(key); }
    void flag(std::string_view key, bool&, std::string_view) { add(key); }
    void text(std::string_view key, std::string&, std::string_view) { add(key); }
    void numbers(std::string_view key, std::vector<double>&, Range, std::string_view) { add(key); }
    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum&, const Choice<Enum> (&)[N], std::string_view) {
        add(key);
    }
    template <class Struct> void group(std::string_view key, Struct& value, std::string_view) {
        const auto before = prefix_;
        prefix_ += std::string(key) + ".";
        describe(*this, value);
        prefix_ = before;
    }
    template <class Struct> void list(std::string_view key, std::vector<Struct>&, std::string_view) { add(key); }

  private:
    void add(std::string_view key) { keys.push_back(prefix_ + std::string(key)); }
    std::string prefix_;
};

const std::vector<std::string>& all_keys() {
    static const auto keys = [] {
        KeyLister lister;
        DetectorSettings detector;
        describe(lister, detector);
        return lister.keys;
    }();
    return keys;
}

// Keys that recordings without pulses say nothing about.
const std::map<std::string, std::string>& keys_not_swept() {
    static const std::map<std::string, std::string> keys{
        {"blanking_ms", "blanking_ms in the settings: it follows from the rig's pulse and latency"},
        {"floor.warm_start_session", "no session: a sweep starts every floor from nothing"}};
    return keys;
}

std::string place(const std::string& source, const YAML::Node& node, const std::string& key) {
    return fmt::format("{}:{}: detector.{}", source, node.Mark().line + 1, key);
}

void read_described(const std::string& source, const YAML::Node& root, DetectorSettings& detector) {
    GridFile grid{detector};
    YamlReader reader(source, "", root);
    describe(reader, grid);
    reader.finish();
    detector = grid.detector;
}

} // namespace

TuneGrid TuneGrid::from_file(const std::filesystem::path& file) {
    TuneGrid grid;
    grid.sources_.push_back({file.string(), load_yaml_file(file)});
    grid.check_each();
    return grid;
}

TuneGrid TuneGrid::from_text(const std::string& yaml, const std::string& source) {
    TuneGrid grid;
    grid.sources_.push_back({source, YAML::Load(yaml)});
    grid.check_each();
    return grid;
}

// Lists give way to their first values, so that the settings' own reader can look at the rest; then each value in turn.
void TuneGrid::check_each() {
    const auto& source = sources_.back();
    if (source.root.IsMap() && source.root["detector"]) {
        read_group(source.root["detector"], "");
    }
    for (const auto& leaf : leaves_) {
        set(leaf, leaf.values.front());
    }
    DetectorSettings scratch;
    read_described(source.name, source.root, scratch);
    for (const auto& leaf : leaves_) {
        std::set<std::string> seen;
        for (const auto& value : leaf.values) {
            set(leaf, value);
            read_described(source.name, source.root, scratch);
            if (!seen.insert(value.Scalar()).second) {
                throw Refusal(place(source.name, value, leaf.key), "'" + value.Scalar() + "' twice", "each value once");
            }
        }
    }
    if (leaves_.empty()) {
        throw Refusal(source.name, "no key with values to try", "detector: and keys below it, each with a list");
    }
    std::sort(leaves_.begin(), leaves_.end(), [](const Leaf& a, const Leaf& b) { return a.order < b.order; });
}

void TuneGrid::read_group(const YAML::Node& group, const std::string& path) {
    const auto& source = sources_.back();
    for (const auto& entry : group) {
        const auto key = path + (entry.first.IsScalar() ? entry.first.Scalar() : std::string{});
        if (entry.second.IsMap()) {
            read_group(entry.second, key + ".");
            continue;
        }
        const auto known = std::find(all_keys().begin(), all_keys().end(), key);
        const auto not_swept = keys_not_swept().find(key);
        if (not_swept != keys_not_swept().end()) {
            throw Refusal(place(source.name, entry.first, key), "a key that no sweep can judge", not_swept->second);
        }
        Leaf leaf{key, {}, static_cast<std::size_t>(known - all_keys().begin()), sources_.size() - 1};
        if (entry.second.IsSequence()) {
            for (const auto& value : entry.second) {
                leaf.values.push_back(value);
            }
        } else {
            leaf.values.push_back(entry.second);
        }
        for (const auto& value : leaf.values) {
            if (value.IsSequence() || value.IsMap()) {
                throw Refusal(place(source.name, value, key), "a list or a group among the values to try",
                              "single values: lists are learned, not swept");
            }
        }
        if (leaf.values.empty()) {
            throw Refusal(place(source.name, entry.first, key), "an empty list", "one value or more");
        }
        leaves_.push_back(std::move(leaf));
    }
}

void TuneGrid::set(const Leaf& leaf, const YAML::Node& value) const {
    YAML::Node group = sources_[leaf.source].root["detector"];
    std::string key = leaf.key;
    for (std::size_t dot = 0; (dot = key.find('.')) != std::string::npos; key.erase(0, dot + 1)) {
        group.reset(group[key.substr(0, dot)]);
    }
    group[key] = value;
}

void TuneGrid::add(TuneGrid other) {
    for (auto& leaf : other.leaves_) {
        const auto same =
            std::find_if(leaves_.begin(), leaves_.end(), [&](const Leaf& mine) { return mine.key == leaf.key; });
        if (same != leaves_.end()) {
            throw Refusal(other.sources_.front().name,
                          "detector." + leaf.key + ", which " + sources_.front().name + " has too",
                          "each key in one of them");
        }
        leaf.source += sources_.size();
        leaves_.push_back(std::move(leaf));
    }
    sources_.insert(sources_.end(), other.sources_.begin(), other.sources_.end());
    std::sort(leaves_.begin(), leaves_.end(), [](const Leaf& a, const Leaf& b) { return a.order < b.order; });
}

std::vector<TuneGrid::Axis> TuneGrid::axes() const {
    std::vector<Axis> axes;
    for (const auto& leaf : leaves_) {
        axes.push_back({leaf.key, {}});
        for (const auto& value : leaf.values) {
            axes.back().values.push_back(value.Scalar());
        }
    }
    return axes;
}

void TuneGrid::apply(const std::vector<std::size_t>& places, DetectorSettings& detector) const {
    for (std::size_t i = 0; i < leaves_.size(); ++i) {
        set(leaves_[i], leaves_[i].values[places[i]]);
    }
    for (const auto& source : sources_) {
        read_described(source.name, source.root, detector);
    }
}

namespace {

// A key that the method does not look at would make settings that differ in name alone.
void refuse_idle(const std::vector<TuneGrid::Axis>& axes, DetectionMethod method) {
    const std::vector<std::string> of_envelope{"filter.", "envelope.", "vote.", "veto.", "threshold.deviations"};
    const std::vector<std::string> of_evidence{"evidence."};
    const auto& idle = method == DetectionMethod::evidence ? of_envelope : of_evidence;
    for (const auto& axis : axes) {
        for (const auto& begin : idle) {
            if (axis.key.starts_with(begin)) {
                throw Refusal("values to try",
                              fmt::format("detector.{}, which method {} does not look at", axis.key,
                                          word_for<DetectionMethod>(detection_methods, method)),
                              "method in the settings or the grid, or other keys");
            }
        }
    }
}

} // namespace

TuneCandidates candidates_of(const TuneGrid& grid, const DetectorSettings& base) {
    TuneCandidates candidates{grid.axes(), {}, {}, 0};
    const auto& axes = candidates.axes;
    const bool rearm_given = std::any_of(
        axes.begin(), axes.end(), [](const TuneGrid::Axis& axis) { return axis.key == "threshold.rearm_deviations"; });
    std::vector<std::size_t> places(axes.size());
    for (bool more = true; more;) {
        auto detector = base;
        grid.apply(places, detector);
        if (candidates.settings.empty()) {
            refuse_idle(axes, detector.method);
        }
        auto& threshold = detector.threshold;
        if (!rearm_given) {
            threshold.rearm_deviations = std::min(base.threshold.rearm_deviations, threshold.deviations);
        }
        if (detector.filter.low_hz < detector.filter.high_hz && threshold.rearm_deviations <= threshold.deviations) {
            candidates.settings.push_back(detector);
            candidates.values.emplace_back();
            for (std::size_t i = 0; i < axes.size(); ++i) {
                candidates.values.back().push_back(axes[i].values[places[i]]);
            }
        } else {
            ++candidates.left_out;
        }
        // Counts up like an odometer, the last axis fastest.
        more = false;
        for (std::size_t i = axes.size(); i > 0 && !more; --i) {
            more = ++places[i - 1] < axes[i - 1].values.size();
            places[i - 1] = more ? places[i - 1] : 0;
        }
    }
    return candidates;
}

} // namespace millpond
