#include "referee/score_json.hpp"

#include <cmath>
#include <string>

namespace millpond {
namespace {

// Writes a described struct.
struct ToJson {
    Json json = Json::object();

    void number(std::string_view key, double value, Range /*range*/, std::string_view /*doc*/) {
        json[std::string(key)] = value;
    }
    void whole(std::string_view key, int value, Range /*range*/, std::string_view /*doc*/) {
        json[std::string(key)] = value;
    }
    void flag(std::string_view key, bool value, std::string_view /*doc*/) { json[std::string(key)] = value; }
    template <class Enum, std::size_t N>
    void choice(std::string_view key, Enum value, const Choice<Enum> (&choices)[N], std::string_view /*doc*/) {
        json[std::string(key)] = word_for<Enum>(choices, value);
    }
    template <class Struct> void group(std::string_view key, Struct& value, std::string_view /*doc*/) {
        ToJson inner;
        describe(inner, value);
        json[std::string(key)] = std::move(inner.json);
    }
};

} // namespace

Json json_of(double figure) {
    return std::isfinite(figure) ? Json(figure) : Json(nullptr);
}

Json json_of(const Proportion& proportion) {
    return {{"share", json_of(proportion.share)},
            {"count", proportion.count},
            {"of", proportion.of},
            {"interval_95", Json::array({json_of(proportion.low), json_of(proportion.high)})}};
}

Json json_of(const Distribution& values) {
    return {{"count", values.count},
            {"least", json_of(values.least)},
            {"quartile1", json_of(values.quartile1)},
            {"median", json_of(values.median)},
            {"quartile3", json_of(values.quartile3)},
            {"p90", json_of(values.p90)},
            {"p99", json_of(values.p99)},
            {"most", json_of(values.most)}};
}

Json json_of(const Bins& bins) {
    return {{"from", bins.from}, {"width", bins.width}, {"counts", bins.counts}};
}

Json json_of(const RefereeSettings& settings) {
    ToJson visit;
    auto copy = settings;
    describe(visit, copy);
    return visit.json;
}

Json json_of(const Score& score) {
    return {{"early_ms", score.early_ms},
            {"eligible_minutes", score.eligible_minutes},
            {"eligible_ripples", score.eligible_ripples},
            {"hits", score.hits},
            {"misses", score.misses},
            {"repeats", score.repeats},
            {"false", score.false_detections},
            {"outside", score.outside},
            {"hit_rate", json_of(score.hit_rate)},
            {"precision", json_of(score.precision)},
            {"false_per_minute", json_of(score.false_per_minute)},
            {"onset_latency_ms", json_of(score.onset_latency_ms)},
            {"onset_latency_histogram_ms", json_of(score.onset_latency_bins)},
            {"elapsed_share", json_of(score.elapsed_share)},
            {"before_half", json_of(score.before_half)}};
}

Json score_definitions() {
    return {
        {"detection", "decision sample of the detector, without those it refused itself: rules gap, unsettled, veto"},
        {"belongs", "onset - early <= detection <= end"},
        {"hit", "a ripple's first detection; later ones of the same ripple are repeats, neither hits nor false"},
        {"miss", "an eligible ripple without a detection"},
        {"false", "a detection in eligible time that belongs to no ripple"},
        {"outside", "a detection outside eligible time, or of a ripple whose onset lies outside it: not counted"},
        {"hit_rate", "hits / eligible ripples"},
        {"precision", "(hits + repeats) / (hits + repeats + false)"},
        {"false_per_minute", "false / eligible minutes"},
        {"onset_latency_ms", "decision sample - onset, over hits"},
        {"elapsed_share", "onset latency / duration of the ripple, over hits"},
        {"before_half", "share of hits with elapsed share <= 0.5"},
        {"interval_95", "Wilson 1927, events taken as independent"},
        {"quantiles", "linear interpolation between the sorted values"}};
}

} // namespace millpond
