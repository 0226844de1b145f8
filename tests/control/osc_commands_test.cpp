#include "base/osc_message.hpp"
#include "control/osc_commands.hpp"

#include <gtest/gtest.h>

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
         {message("/fire"), message("/mark"), message("/arm", {std::int32_t{2}}), std::vector<std::uint8_t>{'x'}}) {
        const auto verdict = osc.read(packet);
        EXPECT_FALSE(verdict.command);
        EXPECT_NE(verdict.refusal.find("allowed:"), std::string::npos);
        EXPECT_EQ(verdict.refusal.find('\n'), std::string::npos);
    }
}

TEST(OscCommands, LettingAButtonGoDoesNothing) {
    const auto verdict = OscCommands("", {}).read(message("/arm", {std::int32_t{0}}));
    EXPECT_FALSE(verdict.command);
    EXPECT_TRUE(verdict.refusal.empty());
}

} // namespace
} // namespace millpond
