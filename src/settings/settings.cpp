#include "settings/settings.hpp"

#include "base/refusal.hpp"
#include "settings/reference_writer.hpp"
#include "settings/yaml_reader.hpp"
#include "settings/yaml_writer.hpp"

#include <algorithm>

namespace millpond {
namespace {

// Files that a settings file names lie where it says, seen from the settings file, whatever folder the program runs in.
void make_absolute(std::string& path, const std::filesystem::path& folder) {
    if (!path.empty()) {
        path = std::filesystem::weakly_canonical(folder / path).string();
    }
}

void check_gates(const std::vector<GateSettings>& gates, const std::string& file) {
    for (std::size_t i = 0; i < gates.size(); ++i) {
        const auto where = file + ": arbiter.gates[" + std::to_string(i) + "].name";
        if (gates[i].name.empty() || gates[i].name.size() > 31) {
            throw Refusal(where, "'" + gates[i].name + "'", "1 to 31 characters");
        }
        if (std::count_if(gates.begin(), gates.end(), [&](const auto& gate) { return gate.name == gates[i].name; }) >
            1) {
            throw Refusal(where, "'" + gates[i].name + "' twice", "each name once");
        }
    }
}

void check_speed_gate(const SpeedGateSettings& gate, const std::string& file) {
    if (gate.opens_below > gate.closes_above) {
        throw Refusal(file + ": speed_gate.opens_below", shortest(gate.opens_below),
                      "at most speed_gate.closes_above, " + shortest(gate.closes_above));
    }
}

void check_plan(const PlanSettings& plan, const std::string& file) {
    constexpr std::size_t most = 1000;
    if (plan.epochs.size() > most) {
        throw Refusal(file + ": plan.epochs", std::to_string(plan.epochs.size()) + " epochs",
                      "at most " + std::to_string(most));
    }
    for (std::size_t i = 0; i < plan.epochs.size(); ++i) {
        const auto& name = plan.epochs[i].name;
        if (name.empty() || name.size() > 21) {
            throw Refusal(file + ": plan.epochs[" + std::to_string(i) + "].name", "'" + name + "'",
                          "1 to 21 characters");
        }
    }
    if (plan.ends_session && plan.epochs.empty()) {
        throw Refusal(file + ": plan.ends_session", "true without epochs", "epochs, or false");
    }
}

void check_floor_limits(const FloorLimitSettings& floor, const std::string& file) {
    const auto check = [&file](const std::string& key, double least, double most) {
        if (least >= most) {
            throw Refusal(file + ": limits.floor." + key + "least_uv", shortest(least),
                          "less than most_uv, " + shortest(most));
        }
    };
    check("", floor.least_uv, floor.most_uv);
    for (std::size_t i = 0; i < floor.channels.size(); ++i) {
        check("channels[" + std::to_string(i) + "].", floor.channels[i].least_uv, floor.channels[i].most_uv);
    }
}

void check_output(const OutputSettings& output, double lockout_ms, const std::string& file) {
    const auto where = [&](std::string_view key) { return file + ": " + output.where(key); };
    if (output.name.empty() || output.name.size() > 31) {
        throw Refusal(where("name"), "'" + output.name + "'", "1 to 31 characters");
    }
    if (output.is_device() && output.device.empty()) {
        throw Refusal(where("device"), "nothing",
                      "the path of a device (kind: " + std::string(word_for<OutputKind>(output_kinds, output.kind)) +
                          ")");
    }
    const auto gives_pulses = [&output](const auto& choice) {
        return choice.word == output.condition && choice.value != Condition::none &&
               choice.value != Condition::assigned;
    };
    if (!output.condition.empty() && std::none_of(std::begin(conditions), std::end(conditions), gives_pulses)) {
        throw Refusal(where("condition"), "'" + output.condition + "'",
                      "disrupt, delayed, yoked, rate_matched, or nothing");
    }
    if (!output.condition.empty() && output.follows != Follows::pulse) {
        throw Refusal(where("condition"), output.condition, "nothing: a marker rises in every condition");
    }
    if (output.longest_high() <= output.width_ms) {
        throw Refusal(where("longest_high_ms"), shortest(output.longest_high_ms),
                      "more than width_ms, " + shortest(output.width_ms));
    }
    // A trigger while the line is still busy could not be played; the lock-out makes sure that there is none.
    if (lockout_ms <= output.train_ms()) {
        throw Refusal(file + ": arbiter.lockout_ms", shortest(lockout_ms),
                      "more than a whole pulse or train of outputs." + output.name + " lasts, " +
                          shortest(output.train_ms()));
    }
}

void check_outputs(const Settings& settings, const std::string& file) {
    const auto& outputs = settings.outputs;
    if (outputs.size() > most_outputs) {
        throw Refusal(file + ": outputs", std::to_string(outputs.size()), "at most " + std::to_string(most_outputs));
    }
    if (std::none_of(outputs.begin(), outputs.end(),
                     [](const auto& output) { return output.follows == Follows::pulse; })) {
        throw Refusal(file + ": outputs", "none with follows: pulse",
                      "at least one; kind: silent where pulses shall go nowhere");
    }
    for (const auto& output : outputs) {
        check_output(output, settings.arbiter.lockout_ms, file);
        if (std::count_if(outputs.begin(), outputs.end(),
                          [&](const auto& other) { return other.name == output.name; }) > 1) {
            throw Refusal(file + ": " + output.where("name"), "twice", "each name once");
        }
    }
}

void check_conditions(const ArbiterSettings& arbiter, const std::string& file) {
    if (plays_schedule(arbiter.condition) && arbiter.schedule_file.empty()) {
        throw Refusal(
            file + ": arbiter.schedule_file", "none",
            "a control schedule (condition: " + std::string(word_for<Condition>(conditions, arbiter.condition)) + ")");
    }
    if (arbiter.delay.least_ms > arbiter.delay.most_ms) {
        throw Refusal(file + ": arbiter.delay.least_ms", shortest(arbiter.delay.least_ms),
                      "at most arbiter.delay.most_ms, " + shortest(arbiter.delay.most_ms));
    }
    const double waiting_ms = arbiter.delay.most_ms + arbiter.hold.longest_ms;
    if (waiting_ms > static_cast<double>(most_delayed_slots) * arbiter.lockout_ms) {
        throw Refusal(file + ": arbiter.delay.most_ms", shortest(arbiter.delay.most_ms),
                      "with hold.longest_ms at most " + std::to_string(most_delayed_slots) + " lock-outs of " +
                          shortest(arbiter.lockout_ms) + " ms");
    }
}

void check_assignment(const Settings& settings, const std::string& file) {
    const bool assigned = settings.arbiter.condition == Condition::assigned;
    if (assigned && settings.assignment.file.empty()) {
        throw Refusal(file + ": assignment.file", "none", "the list that assigns conditions (condition: assigned)");
    }
    if (!assigned && !settings.assignment.file.empty()) {
        throw Refusal(file + ": arbiter.condition",
                      std::string(word_for<Condition>(conditions, settings.arbiter.condition)),
                      "assigned, since assignment.file names a list");
    }
}

} // namespace

void check_settings(const Settings& settings, const std::string& file) {
    if (settings.detector.threshold.rearm_deviations > settings.detector.threshold.deviations) {
        throw Refusal(file + ": detector.threshold.rearm_deviations",
                      shortest(settings.detector.threshold.rearm_deviations),
                      "at most detector.threshold.deviations, " + shortest(settings.detector.threshold.deviations));
    }
    if (settings.detector.filter.low_hz >= settings.detector.filter.high_hz) {
        throw Refusal(file + ": detector.filter.low_hz", shortest(settings.detector.filter.low_hz),
                      "less than detector.filter.high_hz, " + shortest(settings.detector.filter.high_hz));
    }
    check_outputs(settings, file);
    check_conditions(settings.arbiter, file);
    check_assignment(settings, file);
    check_gates(settings.arbiter.gates, file);
    const auto& gates = settings.arbiter.gates;
    const auto names_a_gate = [&gates](std::string_view name) {
        return std::any_of(gates.begin(), gates.end(), [name](const auto& gate) { return gate.name == name; });
    };
    if (settings.detector.state_gate.on && names_a_gate(state_gate_name)) {
        throw Refusal(file + ": arbiter.gates", "a gate named '" + std::string(state_gate_name) + "'",
                      "another name: the signal itself moves that one (detector.state_gate)");
    }
    if (settings.arbiter.speed_gate.on && names_a_gate(speed_gate_name)) {
        throw Refusal(file + ": arbiter.gates", "a gate named '" + std::string(speed_gate_name) + "'",
                      "another name: the animal's speed moves that one (speed_gate)");
    }
    check_speed_gate(settings.arbiter.speed_gate, file);
    check_plan(settings.arbiter.plan, file);
    check_floor_limits(settings.arbiter.limits.floor, file);
}

Settings load_settings(const std::filesystem::path& file) {
    auto settings = read_yaml_file<Settings>(file);
    const auto folder = std::filesystem::absolute(file).parent_path();
    for (auto* path : {&settings.stream.sdp_file, &settings.arbiter.schedule_file, &settings.assignment.file,
                       &settings.detector.floor.warm_start_session, &settings.session.folder}) {
        make_absolute(*path, folder);
    }
    check_settings(settings, file.string());
    return settings;
}

const OutputSettings& pulse_output(const Settings& settings) {
    const OutputSettings* longest = nullptr;
    for (const auto& output : settings.outputs) {
        if (output.follows == Follows::pulse && (longest == nullptr || output.train_ms() > longest->train_ms())) {
            longest = &output;
        }
    }
    return *longest;
}

std::string settings_to_yaml(const Settings& settings) {
    return to_yaml(settings);
}

std::string settings_reference() {
    ReferenceWriter reference;
    Settings defaults;
    describe(reference, defaults);
    return "| key | allowed | default | meaning |\n| --- | --- | --- | --- |\n" + reference.table();
}

} // namespace millpond
