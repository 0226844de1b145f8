// Small files written whole or not at all. Thread: cold.
#pragma once

#include <filesystem>
#include <string>
#include <string_view>

namespace millpond {

/// The name a file has while it is being written.
[[nodiscard]] std::filesystem::path unfinished_path(const std::filesystem::path& file);

/// Writes beside the target and renames at the end. Refuses what cannot be written.
void write_whole_file(const std::filesystem::path& file, std::string_view content);

/// The whole content. Refuses what cannot be read.
[[nodiscard]] std::string read_whole_file(const std::filesystem::path& file);

} // namespace millpond
