#include "recording/whole_file.hpp"

#include "base/refusal.hpp"

#include <cerrno>
#include <cstring>
#include <fstream>
#include <iterator>

namespace millpond {

std::filesystem::path unfinished_path(const std::filesystem::path& file) {
    return file.string() + ".part";
}

void write_whole_file(const std::filesystem::path& file, std::string_view content) {
    const auto unfinished = unfinished_path(file);
    std::ofstream out(unfinished, std::ios::binary | std::ios::trunc);
    out.write(content.data(), static_cast<std::streamsize>(content.size()));
    out.close();
    if (!out) {
        const std::string reason = std::strerror(errno);
        std::error_code ignored;
        std::filesystem::remove(unfinished, ignored);
        throw Refusal(file.string(), "no way to write it (" + reason + ")", "a place with room and the right to write");
    }
    std::filesystem::rename(unfinished, file);
}

std::string read_whole_file(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    std::string content{std::istreambuf_iterator<char>(in), {}};
    if (!in.is_open() || in.bad() || std::filesystem::is_directory(file)) {
        throw Refusal(file.string(), "no file that can be read", "a readable file");
    }
    return content;
}

} // namespace millpond
