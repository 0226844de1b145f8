#include "journal/record_file.hpp"

#include "base/refusal.hpp"
#include "journal/crc32c.hpp"

#include <fmt/format.h>

#include <bit>
#include <cerrno>
#include <cstring>
#include <fcntl.h>
#include <fstream>
#include <unistd.h>

namespace millpond {
namespace {

static_assert(std::endian::native == std::endian::little, "records are little endian, copied as they lie");

// 0x89, CR LF and LF show at once whether a transfer took the file for text or stripped the eighth bit.
constexpr std::array<std::uint8_t, 8> magic{0x89, 'M', 'P', 'J', '\r', '\n', 0x1A, '\n'};
constexpr std::uint32_t record_mark = 0x6D70726B;
constexpr std::size_t header_crc_at = record_header_bytes - 4;

using HeaderBytes = std::array<std::uint8_t, record_header_bytes>;

template <class Value> void put(HeaderBytes& bytes, std::size_t at, Value value) noexcept {
    std::memcpy(bytes.data() + at, &value, sizeof(Value));
}

template <class Value> Value get(std::span<const std::uint8_t> bytes, std::size_t at) noexcept {
    Value value;
    std::memcpy(&value, bytes.data() + at, sizeof(Value));
    return value;
}

HeaderBytes encode_header(const RecordHeader& header) noexcept {
    HeaderBytes bytes{};
    std::copy(magic.begin(), magic.end(), bytes.begin());
    put(bytes, 8, record_format_version);
    put(bytes, 12, static_cast<std::uint32_t>(record_header_bytes));
    put(bytes, 16, static_cast<std::uint32_t>(record_bytes));
    put(bytes, 20, header.channels);
    put(bytes, 24, header.rate.value);
    put(bytes, 32, header.start_utc_ns);
    put(bytes, header_crc_at, crc32c(std::span(bytes).first(header_crc_at)));
    return bytes;
}

// Bytes that reached the file, and errno where they are fewer than asked for.
std::pair<std::size_t, int> write_all(int fd, std::span<const std::uint8_t> bytes) noexcept {
    std::size_t done = 0;
    while (done < bytes.size()) {
        const auto wrote = ::write(fd, bytes.data() + done, bytes.size() - done);
        if (wrote < 0 && errno == EINTR) {
            continue;
        }
        if (wrote <= 0) {
            return {done, wrote < 0 ? errno : ENOSPC};
        }
        done += static_cast<std::size_t>(wrote);
    }
    return {done, 0};
}

void read_header(const std::string& name, std::span<const std::uint8_t> bytes, ReadRecords& read) {
    if (bytes.size() < magic.size() || !std::equal(magic.begin(), magic.end(), bytes.begin())) {
        throw Refusal(name, "no record file", "the records of a session, beginning with 89 4D 50 4A");
    }
    read.header_intact = bytes.size() >= record_header_bytes &&
                         get<std::uint32_t>(bytes, header_crc_at) == crc32c(bytes.first(header_crc_at));
    if (!read.header_intact) {
        read.damage.push_back({UINT64_MAX, 0, "the file's header does not match its checksum"});
        return;
    }
    if (get<std::uint32_t>(bytes, 8) != record_format_version || get<std::uint32_t>(bytes, 16) != record_bytes) {
        throw Refusal(name, fmt::format("record format {}", get<std::uint32_t>(bytes, 8)),
                      fmt::format("record format {}", record_format_version));
    }
    read.header.channels = get<std::uint32_t>(bytes, 20);
    read.header.rate = Hertz{get<double>(bytes, 24)};
    read.header.start_utc_ns = get<std::int64_t>(bytes, 32);
}

// Empty where the record is as it was written.
std::string fault_of(std::span<const std::uint8_t> record, std::uint64_t index) {
    if (get<std::uint32_t>(record, 0) != crc32c(record.subspan(4))) {
        return "does not match its checksum";
    }
    const auto event = get<Event>(record, 8);
    if (get<std::uint32_t>(record, 4) != record_mark || event.sequence != static_cast<std::uint32_t>(index)) {
        return fmt::format("says that it is record {}: records were moved, removed or put in", event.sequence);
    }
    return {};
}

} // namespace

RecordBytes encode_record(const Event& event) noexcept {
    RecordBytes record{};
    std::memcpy(record.data() + 4, &record_mark, 4);
    std::memcpy(record.data() + 8, &event, sizeof(Event));
    const auto crc = crc32c(std::span(record).subspan(4));
    std::memcpy(record.data(), &crc, 4);
    return record;
}

RecordFileWriter::RecordFileWriter(const std::filesystem::path& file, const RecordHeader& header)
    : fd_(::open(file.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_APPEND | O_CLOEXEC, 0644)) {
    if (fd_ < 0) {
        throw Refusal(file.string(), std::strerror(errno), "a new file that can be written");
    }
    const auto [done, error] = write_all(fd_, encode_header(header));
    if (done != record_header_bytes) {
        ::close(fd_);
        throw Refusal(file.string(), std::strerror(error), "a disk with room for the session");
    }
}

RecordFileWriter::~RecordFileWriter() {
    ::close(fd_);
}

Appended RecordFileWriter::append(std::span<Event> events) {
    bytes_.clear();
    for (std::size_t i = 0; i < events.size(); ++i) {
        events[i].sequence = static_cast<std::uint32_t>(records_ + i);
        const auto record = encode_record(events[i]);
        bytes_.insert(bytes_.end(), record.begin(), record.end());
    }
    const auto [done, error] = write_all(fd_, bytes_);
    const auto whole = done / record_bytes;
    records_ += whole;
    if (done != bytes_.size()) {
        // Should even this fail, the reader takes the torn end for what it is.
        [[maybe_unused]] const int cut =
            ::ftruncate(fd_, static_cast<off_t>(record_header_bytes + records_ * record_bytes));
    }
    return {whole, error};
}

ReadRecords read_records(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    if (!in) {
        throw Refusal(file.string(), "no file that can be read", "the records of a session");
    }
    ReadRecords read;
    std::vector<std::uint8_t> bytes(record_header_bytes);
    const auto fill = [&in, &bytes] {
        // uint8_t may alias char; iostreams know only char.
        in.read(reinterpret_cast<char*>(bytes.data()), static_cast<std::streamsize>(bytes.size()));
        return static_cast<std::size_t>(in.gcount());
    };
    bytes.resize(fill());
    read_header(file.string(), bytes, read);
    bytes.resize(1024 * record_bytes);
    for (std::uint64_t index = 0;;) {
        const auto got = fill();
        const std::span<const std::uint8_t> chunk(bytes.data(), got);
        for (std::size_t at = 0; at + record_bytes <= got; at += record_bytes, ++index) {
            const auto record = chunk.subspan(at, record_bytes);
            if (auto fault = fault_of(record, index); !fault.empty()) {
                read.damage.push_back({index, record_header_bytes + index * record_bytes, std::move(fault)});
                read.closed = false;
                continue;
            }
            read.events.push_back(get<Event>(record, 8));
            read.closed = read.events.back().kind == EventKind::session_end;
        }
        if (got < bytes.size()) {
            read.torn_bytes = got % record_bytes;
            break;
        }
    }
    read.closed = read.closed && read.torn_bytes == 0;
    return read;
}

} // namespace millpond
