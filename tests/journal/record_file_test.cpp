#include "base/refusal.hpp"
#include "journal/crc32c.hpp"
#include "journal/record_file.hpp"
#include "journal/session_support.hpp"

#include <gtest/gtest.h>

#include <string_view>

namespace millpond {
namespace {

using namespace test;

std::vector<std::uint8_t> bytes_of(std::string_view text) {
    return {text.begin(), text.end()};
}

class RecordFile : public ::testing::Test {
  protected:
    void write(std::uint64_t count) {
        RecordFileWriter writer(file, {2, Hertz{1250.0}, 1'700'000'000'000'000'000});
        std::vector<Event> events;
        for (std::uint64_t i = 0; i < count; ++i) {
            events.push_back(numbered_note(i));
        }
        ASSERT_EQ(writer.append(events).records, count);
    }

    TemporaryFolder folder;
    std::filesystem::path file = folder.path() / "records.mpj";
};

// 0xE3069283 for "123456789": the check value of CRC-32C, common practice. The others: RFC 3720 B.4.
TEST(Crc32c, GivesTheStandardsCheckValues) {
    EXPECT_EQ(crc32c(bytes_of("123456789")), 0xE3069283U);
    EXPECT_EQ(crc32c(std::vector<std::uint8_t>(32, 0x00)), 0x8A9136AAU);
    EXPECT_EQ(crc32c(std::vector<std::uint8_t>(32, 0xFF)), 0x62A8AB43U);
}

TEST_F(RecordFile, ReadsBackHeaderAndEveryRecordInOrder) {
    write(3000);
    const auto read = read_records(file);
    EXPECT_EQ(read.header, (RecordHeader{2, Hertz{1250.0}, 1'700'000'000'000'000'000}));
    ASSERT_EQ(read.events.size(), 3000U);
    for (std::uint64_t i = 0; i < 3000; ++i) {
        EXPECT_EQ(number_in(read.events[i]), i);
        EXPECT_EQ(read.events[i].sequence, i);
    }
    EXPECT_TRUE(read.damage.empty());
    EXPECT_FALSE(read.closed);
    EXPECT_EQ(std::filesystem::file_size(file), 64 + 3000 * 72U);
}

TEST_F(RecordFile, TornLastRecordIsToldAndTheRestIsRead) {
    write(10);
    std::filesystem::resize_file(file, 64 + 9 * 72 + 31);
    const auto read = read_records(file);
    EXPECT_EQ(read.events.size(), 9U);
    EXPECT_EQ(read.torn_bytes, 31U);
    EXPECT_TRUE(read.damage.empty());
    EXPECT_FALSE(read.closed);
}

TEST_F(RecordFile, FlippedBitIsFoundAndNamedByPlaceAndTheRestIsRead) {
    write(10);
    flip_bit(file, 64 + 4 * 72 + 40);
    const auto read = read_records(file);
    EXPECT_EQ(read.events.size(), 9U);
    ASSERT_EQ(read.damage.size(), 1U);
    EXPECT_EQ(read.damage[0], (RecordDamage{4, 64 + 4 * 72, "does not match its checksum"}));
}

TEST_F(RecordFile, EveryBitOfARecordIsCovered) {
    write(3);
    for (std::uint64_t byte = 64 + 72; byte < 64 + 2 * 72; ++byte) {
        flip_bit(file, byte);
        EXPECT_EQ(read_records(file).damage.size(), 1U) << byte;
        flip_bit(file, byte);
    }
    EXPECT_TRUE(read_records(file).damage.empty());
}

TEST_F(RecordFile, RemovedRecordIsNoticed) {
    write(4);
    auto bytes = text_of(file);
    bytes.erase(64 + 72, 72);
    std::ofstream(file, std::ios::binary) << bytes;
    const auto read = read_records(file);
    EXPECT_EQ(read.events.size(), 1U);
    EXPECT_EQ(read.damage.size(), 2U);
}

TEST_F(RecordFile, DamagedHeaderIsToldAndTheRecordsAreRead) {
    write(4);
    flip_bit(file, 24);
    const auto read = read_records(file);
    EXPECT_FALSE(read.header_intact);
    EXPECT_EQ(read.events.size(), 4U);
    EXPECT_EQ(read.damage.size(), 1U);
}

TEST_F(RecordFile, NeverOverwrites) {
    write(1);
    EXPECT_THROW(RecordFileWriter(file, {}), Refusal);
    EXPECT_EQ(read_records(file).events.size(), 1U);
}

TEST_F(RecordFile, AnotherKindOfFileIsRefused) {
    std::ofstream(file) << "onset\tduration\n";
    EXPECT_THROW(static_cast<void>(read_records(file)), Refusal);
}

} // namespace
} // namespace millpond
