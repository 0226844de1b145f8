// Figures of delayed and scheduled pulses as text, JSON and a table.
#include "audit/control_figures.hpp"

#include <fmt/format.h>

namespace millpond {
namespace {

std::string share(const Proportion& part) {
    return part.of == 0 ? std::string("not known")
                        : fmt::format("{} of {}, {:.1f} % (95 %: {:.1f} to {:.1f} %)", part.count, part.of,
                                      100.0 * part.share, 100.0 * part.low, 100.0 * part.high);
}

std::string told(const Distribution& values, const char* unit, int digits) {
    if (values.count == 0) {
        return "none";
    }
    return fmt::format("median {:.{}f}, quartiles {:.{}f} to {:.{}f}, least {:.{}f}, most {:.{}f} {}", values.median,
                       digits, values.quartile1, digits, values.quartile3, digits, values.least, digits, values.most,
                       digits, unit);
}

std::string omitted_text(const MomentFigures& f) {
    std::string text;
    for (std::size_t rule = 0; rule < rule_count; ++rule) {
        if (f.omitted_by[rule] > 0) {
            text += fmt::format("{}{} {}", text.empty() ? ": " : ", ", f.omitted_by[rule],
                                name_of(static_cast<Rule>(rule)));
        }
    }
    return fmt::format("{}{}", f.omitted, text);
}

std::string figures_text(const MomentFigures& f, const char* what, const char* planned) {
    auto text = fmt::format("  {}: {}{} came, {} given, {} phantom, {} catch trials\n", what,
                            f.planned ? fmt::format("{} planned, ", *f.planned) : "", f.came, f.given, f.phantoms,
                            f.catch_trials);
    text += fmt::format("    omitted {}\n", omitted_text(f));
    if (f.not_reached) {
        text += fmt::format("    not reached {}\n", *f.not_reached);
    }
    if (f.after_trigger_ms.count > 0) {
        text += fmt::format("    after the trigger: {}\n", told(f.after_trigger_ms, "ms", 1));
    } else {
        text += fmt::format("    held {}: {}\n", f.held, told(f.held_ms, "ms", 1));
    }
    text +=
        fmt::format("    in ripples: given {}; phantom {}\n", share(f.given_in_ripples), share(f.phantoms_in_ripples));
    text += fmt::format("    intervals {}: {}\n    intervals as they came: {}\n", planned,
                        told(f.planned_intervals_s, "s", 3), told(f.kept_intervals_s, "s", 3));
    return text + fmt::format("    {}\n", told(f.compared, "intervals"));
}

Json test_json(const TwoSampleTest& test) {
    if (!test.known()) {
        return nullptr;
    }
    return {{"test", "Kolmogorov-Smirnov, two-sided"},
            {"d", test.d},
            {"p", test.p},
            {"p_by", test.exact ? "exact" : "limit law"},
            {"intervals_kept", test.first},
            {"intervals_planned", test.second}};
}

Json figures_json(const MomentFigures& f) {
    auto omitted = Json::object();
    for (std::size_t rule = 1; rule < rule_count; ++rule) {
        omitted[std::string(name_of(static_cast<Rule>(rule)))] = f.omitted_by[rule];
    }
    return {{"planned", f.planned ? Json(*f.planned) : Json(nullptr)},
            {"came", f.came},
            {"given", f.given},
            {"phantom", f.phantoms},
            {"catch_trials", f.catch_trials},
            {"omitted", f.omitted},
            {"omitted_by", omitted},
            {"not_reached", f.not_reached ? Json(*f.not_reached) : Json(nullptr)},
            {"given_in_ripples", json_of(f.given_in_ripples)},
            {"phantom_in_ripples", json_of(f.phantoms_in_ripples)},
            {"planned_intervals_s", json_of(f.planned_intervals_s)},
            {"kept_intervals_s", json_of(f.kept_intervals_s)},
            {"compared", test_json(f.compared)}};
}

} // namespace

std::string control_text(const ControlFigures& figures) {
    if (figures.none() && figures.about_schedule.empty()) {
        return {};
    }
    std::string text = "\nControls: moments for pulses, planned and come\n";
    if (!figures.about_schedule.empty()) {
        text += fmt::format("  control schedule: {}\n", figures.about_schedule);
    }
    if (figures.scheduled.came > 0 || figures.scheduled.planned) {
        text += figures_text(figures.scheduled, "scheduled", "as planned");
    }
    if (figures.delayed.came > 0) {
        text += figures_text(figures.delayed, "delayed", "of their triggers");
    }
    return text;
}

Json control_json(const ControlFigures& figures) {
    auto scheduled = figures_json(figures.scheduled), delayed = figures_json(figures.delayed);
    scheduled["held"] = figures.scheduled.held;
    scheduled["held_ms"] = json_of(figures.scheduled.held_ms);
    delayed["after_trigger_ms"] = json_of(figures.delayed.after_trigger_ms);
    return {{"scheduled", scheduled},
            {"delayed", delayed},
            {"about_schedule", figures.about_schedule.empty() ? Json(nullptr) : Json(figures.about_schedule)}};
}

std::string control_table(const ControlFigures& figures, Hertz rate) {
    std::string text = "onset\tduration\ttrial_type\tsample\torigin\tnumber\tfrom\tlater_ms\trule\tin_ripple\n";
    for (const auto& moment : figures.moments) {
        text += fmt::format("{}\t0\t{}\t{}\t{}\t{}\t{}\t{:.3f}\t{}\t{}\n", seconds_at(moment.at, rate),
                            name_of(moment.fate), moment.at.value, name_of(moment.origin), moment.number,
                            moment.from.value, 1000.0 * static_cast<double>(moment.at - moment.from) / rate.value,
                            moment.fate == MomentFate::omitted ? name_of(moment.rule) : "n/a",
                            moment.in_ripple ? (*moment.in_ripple ? "yes" : "no") : "n/a");
    }
    return text;
}

} // namespace millpond
