#include "base/osc_message.hpp"
#include "control/osc_commands.hpp"

#include <gtest/gtest.h>

#include <limits>

namespace millpond {
namespace {

std::vector<std::uint8_t> message(const std::string& address, const std::vector<OscArgument>& arguments = {}) {
    return encode_osc(address, arguments, "test");
}

TEST(OscCommands, TakesArmDisarmMarkAndGate) {
    const OscCommands osc("", {"immobile"});
    EXPECT_EQ(osc.read(message("/arm")).command->kind, CommandKind::arm);
    EXPECT_EQ(osc.read(message("/disarm")).command->kind, CommandKind::disarm);
    const auto mark = osc.read(message("/mark", {std::string("lights off")}));
    EXPECT_EQ(mark.command->kind, CommandKind::mark);
    EXPECT_EQ(mark.command->words(), "lights off");
    EXPECT_EQ(osc.read(message("/gate", {std::string("immobile"), std::int32_t{1}})).command->kind,
              CommandKind::open_gate);
    EXPECT_EQ(osc.read(message("/gate", {std::string("immobile"), std::int32_t{0}})).command->kind,
              CommandKind::close_gate);
}

TEST(OscCommands, UnknownGateIsRefusedWithTheNearestName) {
    const OscCommands osc("", {"immobile", "region"});
    const auto verdict = osc.read(message("/gate", {std::string("imobile"), std::int32_t{1}}));
    EXPECT_FALSE(verdict.command);
    EXPECT_NE(verdict.refusal.find("did you mean 'immobile'?"), std::string::npos) << verdict.refusal;
}

TEST(OscCommands, WithASecretNothingIsTakenWithoutIt) {
    const OscCommands osc("open sesame", {});
    EXPECT_FALSE(osc.read(message("/arm")).command);
    EXPECT_FALSE(osc.read(message("/arm", {std::string("open sesamf")})).command);
    EXPECT_FALSE(osc.read(message("/arm", {std::string("open sesame!")})).command);
    EXPECT_FALSE(osc.read(message("/disarm", {std::int32_t{1}})).command);
    EXPECT_TRUE(osc.read(message("/arm", {std::string("open sesame")})).command);
    EXPECT_EQ(osc.read(message("/mark", {std::string("open sesame"), std::string("x")})).command->words(), "x");
}

TEST(OscCommands, AnythingElseIsRefusedInOneLine) {
    const OscCommands osc("", {});
    for (const auto& packet :
         {message("/fire"), message("/mark"), message("/arm", {std::int32_t{2}}), std::vector<std::uint8_t>{'x'},
          message("/clear", {std::string("all")}), message("/epoch"), message("/speed", {3.0F})}) {
        const auto verdict = osc.read(packet);
        EXPECT_FALSE(verdict.command);
        EXPECT_NE(verdict.refusal.find("allowed:"), std::string::npos);
        EXPECT_EQ(verdict.refusal.find('\n'), std::string::npos);
    }
}

TEST(OscCommands, TakesEpochAndSpeedWhereTheSettingsAskForThem) {
    const OscCommands osc("", {}, {false, true, true});
    EXPECT_EQ(osc.read(message("/epoch")).command->kind, CommandKind::next_epoch);
    EXPECT_EQ(osc.read(message("/epoch", {std::int32_t{1}})).command->kind, CommandKind::next_epoch);
    const auto speed = osc.read(message("/speed", {3.5F}));
    EXPECT_EQ(speed.command->kind, CommandKind::speed);
    EXPECT_EQ(speed.command->number, 3.5);
    EXPECT_EQ(osc.read(message("/speed", {std::int32_t{12}})).command->number, 12.0);
}

TEST(OscCommands, ASpeedThatIsNoneIsRefusedInOneLine) {
    const OscCommands osc("", {}, {false, true, true});
    constexpr float infinity = std::numeric_limits<float>::infinity();
    for (const auto& packet :
         {message("/speed"), message("/speed", {std::string("fast")}), message("/speed", {1.0F, 2.0F}),
          message("/speed", {-0.1F}), message("/speed", {std::numeric_limits<float>::quiet_NaN()}),
          message("/speed", {infinity}), message("/speed", {-infinity})}) {
        const auto verdict = osc.read(packet);
        EXPECT_FALSE(verdict.command);
        EXPECT_NE(verdict.refusal.find("OSC /speed: found "), std::string::npos) << verdict.refusal;
        EXPECT_NE(verdict.refusal.find("; allowed: "), std::string::npos) << verdict.refusal;
        EXPECT_EQ(verdict.refusal.find('\n'), std::string::npos);
    }
}

TEST(OscCommands, StopIsTakenWhateverItCarries) {
    const OscCommands osc("open sesame", {});
    for (const auto& packet : {message("/stop"), message("/stop", {std::int32_t{0}}),
                               message("/stop", {std::string("wrong secret"), 1.0F})}) {
        EXPECT_EQ(osc.read(packet).command->kind, CommandKind::stop);
    }
    EXPECT_FALSE(osc.read(message("/clear")).command) << "that needs the secret";
    EXPECT_EQ(osc.read(message("/clear", {std::string("open sesame")})).command->kind, CommandKind::clear);
}

TEST(OscCommands, LettingAButtonGoDoesNothing) {
    const auto verdict = OscCommands("", {}).read(message("/arm", {std::int32_t{0}}));
    EXPECT_FALSE(verdict.command);
    EXPECT_TRUE(verdict.refusal.empty());
}

} // namespace
} // namespace millpond
