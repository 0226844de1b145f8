#include "control/osc_commands.hpp"

#include "base/osc_message.hpp"
#include "base/refusal.hpp"

#include <algorithm>

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

} // namespace

OscVerdict OscCommands::read(std::span<const std::uint8_t> packet) const {
    OscMessage message;
    if (const auto trouble = decode_osc(packet, message); trouble != OscTrouble::none) {
        return {{}, "OSC packet: found " + std::string(name_of(trouble)) + "; allowed: one OSC 1.0 message"};
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
    if (message.address == "/trial" && !trials_) {
        return refused(message, "a session without trials", "/trial where assignment.file names a list of trials");
    }
    if (message.address != "/arm" && message.address != "/disarm" && message.address != "/trial") {
        return refused(message, "an unknown address", "/arm, /disarm, /mark, /gate, /trial");
    }
    // A switch that sends 1 when pressed and 0 when let go is common on control surfaces: 0 does nothing.
    if (values.size() > 1 || (values.size() == 1 && !switch_of(values[0]))) {
        return refused(message, "other arguments", "none, or 1");
    }
    if (values.size() == 1 && !*switch_of(values[0])) {
        return {{}, {}};
    }
    const auto kind = message.address == "/arm"     ? CommandKind::arm
                      : message.address == "/trial" ? CommandKind::trial
                                                    : CommandKind::disarm;
    return {Command::make(kind), {}};
}

} // namespace millpond
