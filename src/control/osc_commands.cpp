#include "control/osc_commands.hpp"

#include "base/osc_message.hpp"
#include "base/refusal.hpp"

#include <algorithm>
#include <cmath>
#include <iterator>
#include <utility>

namespace millpond {
namespace {

using Value = OscMessage::Value;

OscVerdict refused(const OscMessage& message, const std::string& found, const std::string& allowed) {
    return {{}, "OSC " + std::string(message.address) + ": found " + found + "; allowed: " + allowed};
}

// Compares all of it whatever differs first, so that the time taken tells nothing.
bool same_secret(std::string_view given, std::string_view secret) {
    unsigned char differs = given.size() == secret.size() ? 0 : 1;
    for (std::size_t i = 0; i < secret.size(); ++i) {
        const char got = i < given.size() ? given[i] : '\0';
        differs = static_cast<unsigned char>(differs | static_cast<unsigned char>(got ^ secret[i]));
    }
    return differs == 0;
}

std::optional<bool> switch_of(const Value& value) {
    const bool whole = value.type == 'i' || value.type == 'T' || value.type == 'F';
    if (whole && (value.whole == 0 || value.whole == 1)) {
        return value.whole == 1;
    }
    if (value.type == 'f' && (value.number == 0.0F || value.number == 1.0F)) {
        return value.number == 1.0F;
    }
    return std::nullopt;
}

OscVerdict read_gate(const OscMessage& message, std::span<const Value> values, const std::vector<std::string>& gates) {
    const bool form = values.size() == 2 && values[0].type == 's' && switch_of(values[1]);
    if (!form) {
        return refused(message, "other arguments", "a gate's name and 1 (open) or 0 (closed)");
    }
    const std::string name(values[0].text);
    if (std::find(gates.begin(), gates.end(), name) == gates.end()) {
        const auto near = nearest_name(name, gates);
        return refused(message, "no gate '" + name + "'",
                       near.empty() ? "a name of arbiter.gates" : "did you mean '" + near + "'?");
    }
    return {Command::make(*switch_of(values[1]) ? CommandKind::open_gate : CommandKind::close_gate, name), {}};
}

OscVerdict read_speed(const OscMessage& message, std::span<const Value> values, bool wanted) {
    if (!wanted) {
        return refused(message, "a session without a speed gate", "speed_gate.on: true in the settings");
    }
    if (values.size() != 1 || (values[0].type != 'f' && values[0].type != 'i')) {
        return refused(message, "other arguments", "one number, a float32 or an int32");
    }
    const double speed = values[0].type == 'f' ? static_cast<double>(values[0].number) : values[0].whole;
    if (!std::isfinite(speed) || speed < 0.0) {
        return refused(message, std::isfinite(speed) ? "a speed below 0" : "a speed that is no finite number",
                       "0 or more, in the unit of speed_gate.unit");
    }
    auto command = Command::make(CommandKind::speed);
    command.number = speed;
    return {command, {}};
}

/// Commands that a button can give.
std::optional<CommandKind> pressed_command(std::string_view address) {
    static constexpr std::pair<std::string_view, CommandKind> buttons[] = {{"/arm", CommandKind::arm},
                                                                           {"/disarm", CommandKind::disarm},
                                                                           {"/clear", CommandKind::clear},
                                                                           {"/epoch", CommandKind::next_epoch},
                                                                           {"/trial", CommandKind::trial}};
    const auto* const found =
        std::find_if(std::begin(buttons), std::end(buttons), [&](const auto& each) { return each.first == address; });
    return found == std::end(buttons) ? std::nullopt : std::optional(found->second);
}

} // namespace

OscVerdict OscCommands::read(std::span<const std::uint8_t> packet) const {
    OscMessage message;
    if (const auto trouble = decode_osc(packet, message); trouble != OscTrouble::none) {
        return {{}, "OSC packet: found " + std::string(name_of(trouble)) + "; allowed: one OSC 1.0 message"};
    }
    // Whatever else it carries, the secret or not: it can only make things safer.
    if (message.address == "/stop") {
        return {Command::make(CommandKind::stop), {}};
    }
    std::span<const Value> values(message.values.data(), message.count);
    if (!secret_.empty()) {
        if (values.empty() || values[0].type != 's' || !same_secret(values[0].text, secret_)) {
            return refused(message, "no secret or a wrong one", "the secret of the settings as first argument");
        }
        values = values.subspan(1);
    }
    if (message.address == "/gate") {
        return read_gate(message, values, gates_);
    }
    if (message.address == "/mark") {
        const bool form = values.size() == 1 && values[0].type == 's' && !values[0].text.empty();
        return form ? OscVerdict{Command::make(CommandKind::mark, values[0].text), {}}
                    : refused(message, "other arguments", "one text");
    }
    if (message.address == "/speed") {
        return read_speed(message, values, more_.speed);
    }
    const auto kind = pressed_command(message.address);
    if (!kind) {
        return refused(message, "an unknown address",
                       "/arm, /disarm, /stop, /clear, /mark, /gate, /epoch, /speed, /trial");
    }
    if (*kind == CommandKind::next_epoch && !more_.epoch) {
        return refused(message, "a session without a plan", "epochs in plan.epochs of the settings");
    }
    if (*kind == CommandKind::trial && !more_.trials) {
        return refused(message, "a session without trials", "/trial where assignment.file names a list of trials");
    }
    // A switch that sends 1 when pressed and 0 when let go is common on control surfaces: 0 does nothing.
    if (values.size() > 1 || (values.size() == 1 && !switch_of(values[0]))) {
        return refused(message, "other arguments", "none, or 1");
    }
    if (values.size() == 1 && !*switch_of(values[0])) {
        return {{}, {}};
    }
    return {Command::make(*kind), {}};
}

} // namespace millpond
