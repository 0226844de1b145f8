#include "base/refusal.hpp"
#include "support/files.hpp"
#include "tuning/work_file.hpp"

#include <gtest/gtest.h>

#include <bit>
#include <functional>

namespace millpond {
namespace {

using test::TemporaryFolder;
using test::text_of;
using test::write_text;

const WorkIdentity identity{"millpond 9", "samples", "ripples", "grid", 10};

SweepResult odd_result() {
    SweepResult result;
    result.training.hits = 17;
    result.training.false_per_minute = 1.0 / 3.0; // not a short decimal
    result.training.latency_median_ms = not_known;
    result.held_out.eligible_minutes = 5e-324;
    result.delay_ms = 11.1;
    return result;
}

std::string refusal_of(const std::function<void()>& act) {
    try {
        act();
    } catch (const Refusal& refusal) {
        return refusal.what();
    }
    return "nothing was refused";
}

void expect_same_bits(double a, double b) {
    EXPECT_EQ(std::bit_cast<std::uint64_t>(a), std::bit_cast<std::uint64_t>(b));
}

TEST(WorkFile, GivesBackWhatItWasGivenToTheBit) {
    const TemporaryFolder folder;
    auto work = WorkFile::begin(folder / "w", identity, {});
    work.keep(SweepStage::swept, 4, odd_result());
    work.keep(SweepStage::confirmed, 9, odd_result());
    const auto read = WorkFile::resume(folder / "w", identity, {});
    ASSERT_TRUE(read.swept()[4] && read.confirmed()[9]);
    EXPECT_FALSE(read.swept()[9] || read.confirmed()[4]);
    EXPECT_EQ(read.swept()[4]->training.hits, 17U);
    expect_same_bits(read.swept()[4]->training.false_per_minute, 1.0 / 3.0);
    expect_same_bits(read.swept()[4]->training.latency_median_ms, not_known);
    expect_same_bits(read.confirmed()[9]->held_out.eligible_minutes, 5e-324);
    expect_same_bits(read.confirmed()[9]->delay_ms, 11.1);
}

TEST(WorkFile, LeavesOutALastLineThatWasCutAndGoesOnAfterIt) {
    const TemporaryFolder folder;
    auto work = WorkFile::begin(folder / "w", identity, {});
    work.keep(SweepStage::swept, 1, odd_result());
    work.keep(SweepStage::swept, 2, odd_result());
    const auto whole = text_of(folder / "w");
    write_text(folder / "w", whole.substr(0, whole.size() - 9));
    auto again = WorkFile::resume(folder / "w", identity, {});
    EXPECT_TRUE(again.swept()[1]);
    EXPECT_FALSE(again.swept()[2]);
    again.keep(SweepStage::swept, 2, odd_result());
    EXPECT_EQ(text_of(folder / "w"), whole);
}

TEST(WorkFile, OfOtherWorkIsRefusedInALineThatSaysWhatDiffers) {
    const TemporaryFolder folder;
    static_cast<void>(WorkFile::begin(folder / "w", identity, {}));
    const auto refused = [&](WorkIdentity other, SweepPart part = {}) {
        return refusal_of([&] { static_cast<void>(WorkFile::resume(folder / "w", other, part)); });
    };
    auto other = identity;
    other.recordings = "others";
    EXPECT_NE(refused(other).find("w:3: found work of another set of recordings"), std::string::npos) << refused(other);
    other = identity;
    other.truth = "others";
    EXPECT_NE(refused(other).find("another set of ripples"), std::string::npos);
    other = identity;
    other.settings = "others";
    EXPECT_NE(refused(other).find("another grid or plan"), std::string::npos);
    other = identity;
    other.program = "millpond 10";
    EXPECT_NE(refused(other).find("another version of the program"), std::string::npos);
    EXPECT_NE(refused(identity, {2, 3}).find("another part"), std::string::npos);
    EXPECT_EQ(refused(other).find('\n'), std::string::npos);
}

TEST(WorkFile, ThatIsDamagedOrNoneIsRefused) {
    const TemporaryFolder folder;
    write_text(folder / "none", "onset\tduration\n");
    EXPECT_NE(refusal_of([&] {
                  static_cast<void>(WorkFile::read(folder / "none", identity, {}));
              }).find("no work file of tune"),
              std::string::npos);
    auto work = WorkFile::begin(folder / "w", identity, {});
    const auto head = text_of(folder / "w");
    for (const std::string line : {"swept\t1\t2\n", "other\t1\t2\n", "\n"}) {
        write_text(folder / "w", head + line);
        EXPECT_NE(
            refusal_of([&] { static_cast<void>(WorkFile::read(folder / "w", identity, {})); }).find("a damaged line"),
            std::string::npos)
            << line;
    }
    work = WorkFile::begin(folder / "w", identity, {});
    work.keep(SweepStage::swept, 9, odd_result());
    auto smaller = text_of(folder / "w");
    smaller.replace(smaller.find("candidates\t10"), 13, "candidates\t9");
    write_text(folder / "w", smaller);
    auto nine = identity;
    nine.candidates = 9;
    EXPECT_THROW(static_cast<void>(WorkFile::read(folder / "w", nine, {})), Refusal);
}

TEST(SweepPart, CoverAllSettingsOnceWhateverTheirNumbers) {
    for (const std::size_t candidates : {1, 7, 500}) {
        for (const std::size_t of : {1, 3, 20}) {
            std::size_t next = 0;
            for (std::size_t number = 1; number <= of; ++number) {
                EXPECT_EQ(SweepPart({number, of}).first(candidates), next);
                next = SweepPart({number, of}).last(candidates);
            }
            EXPECT_EQ(next, candidates);
        }
    }
}

void write_part(const std::filesystem::path& out, SweepPart part, std::size_t less = 0) {
    auto work = WorkFile::begin(work_path(out, part), identity, part);
    for (auto i = part.first(10); i + less < part.last(10); ++i) {
        auto result = odd_result();
        result.training.hits = i;
        work.keep(SweepStage::swept, i, result);
    }
}

TEST(Merge, PutsAllPartsTogether) {
    const TemporaryFolder folder;
    const auto out = folder / "o.yaml";
    for (std::size_t number = 1; number <= 3; ++number) {
        write_part(out, {number, 3});
    }
    write_part(folder / "other.yaml", {1, 4}); // of another outcome beside it
    const auto all = merge_parts(out, identity);
    for (std::size_t i = 0; i < 10; ++i) {
        EXPECT_EQ(all[i]->training.hits, i);
    }
}

TEST(Merge, RefusesPartsThatAreMissingUnfinishedOrOfAnotherDivision) {
    const TemporaryFolder folder;
    const auto out = folder / "o.yaml";
    const auto refused = [&] { return refusal_of([&] { static_cast<void>(merge_parts(out, identity)); }); };
    EXPECT_NE(refused().find("no part beside"), std::string::npos) << refused();
    write_part(out, {1, 3});
    write_part(out, {3, 3});
    EXPECT_NE(refused().find("no part 2 of 3"), std::string::npos) << refused();
    write_part(out, {2, 3}, 1);
    EXPECT_NE(refused().find("not finished"), std::string::npos) << refused();
    write_part(out, {2, 3});
    EXPECT_EQ(refused(), "nothing was refused");
    write_part(out, {2, 4});
    EXPECT_NE(refused().find("parts of 3 and of 4"), std::string::npos) << refused();
}

} // namespace
} // namespace millpond
