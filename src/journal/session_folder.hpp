// A new session folder: either all of its first files are there, or the folder is not. Thread: control.
#pragma once

#include "journal/session_settings.hpp"

#include <cstdint>
#include <filesystem>
#include <string_view>

namespace millpond {

/// Names inside the folder.
inline constexpr const char* records_name = "records.mpj";
inline constexpr const char* settings_name = "settings.yaml";
inline constexpr const char* provenance_name = "provenance.json";

/// Filled under a hidden name, then renamed to `<folder>/<UTC start>_<name>`. Gone again where `commit` was never
/// called.
class NewSessionFolder {
  public:
    /// Refuses a bad name, a session that exists already and a disk with less than min_free_mb left.
    NewSessionFolder(const SessionSettings& settings, std::int64_t start_utc_ns);
    ~NewSessionFolder();
    NewSessionFolder(const NewSessionFolder&) = delete;
    NewSessionFolder& operator=(const NewSessionFolder&) = delete;

    /// Where to write until `commit`.
    [[nodiscard]] const std::filesystem::path& working() const noexcept { return working_; }
    void write_text(const char* name, std::string_view text) const;
    /// The folder's final place. Open files stay open.
    std::filesystem::path commit();

  private:
    std::filesystem::path final_, working_;
    bool committed_ = false;
};

} // namespace millpond
