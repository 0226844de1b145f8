#include "journal/session_folder.hpp"

#include "base/refusal.hpp"
#include "journal/disk_watch.hpp"
#include "journal/provenance.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cerrno>
#include <cstdio>
#include <cstring>
#include <fcntl.h>
#include <fstream>

namespace millpond {
namespace {

void check_name(const std::string& name) {
    const auto allowed = [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '.' || c == '-' ||
               c == '_';
    };
    if (name.empty() || name.size() > 100 || !std::all_of(name.begin(), name.end(), allowed)) {
        throw Refusal("session.name", "'" + name + "'", "1 to 100 letters, digits, dots, - and _");
    }
}

} // namespace

NewSessionFolder::NewSessionFolder(const SessionSettings& settings, std::int64_t start_utc_ns) {
    check_name(settings.name);
    const std::filesystem::path parent = settings.folder;
    const auto name = utc_text(start_utc_ns, true) + "_" + settings.name;
    final_ = parent / name;
    working_ = parent / ("." + name + ".partial");
    std::error_code trouble;
    std::filesystem::create_directories(parent, trouble);
    if (trouble) {
        throw Refusal("session.folder: " + parent.string(), trouble.message(), "a folder that can be made and written");
    }
    if (const auto free = free_mb(parent); free < settings.min_free_mb) {
        throw Refusal("session.folder: " + parent.string(), fmt::format("{:.0f} MB of free disk space", free),
                      fmt::format("{} MB and more (session.min_free_mb)", settings.min_free_mb));
    }
    if (std::filesystem::exists(final_) || !std::filesystem::create_directory(working_, trouble)) {
        committed_ = true; // not ours to clean up
        throw Refusal(final_.string(), trouble ? trouble.message() : "a session of this name and second",
                      "a session that does not exist yet");
    }
}

NewSessionFolder::~NewSessionFolder() {
    if (!committed_) {
        std::error_code ignored;
        std::filesystem::remove_all(working_, ignored);
    }
}

void NewSessionFolder::write_text(const char* name, std::string_view text) const {
    std::ofstream out(working_ / name, std::ios::binary);
    out << text;
    if (!out.flush()) {
        throw Refusal((working_ / name).string(), "a disk that did not take it", "a disk with room for the session");
    }
}

std::filesystem::path NewSessionFolder::commit() {
    // rename(2) would replace an empty folder; RENAME_NOREPLACE replaces nothing.
    if (::renameat2(AT_FDCWD, working_.c_str(), AT_FDCWD, final_.c_str(), RENAME_NOREPLACE) != 0) {
        throw Refusal(final_.string(), std::strerror(errno), "a session that does not exist yet");
    }
    committed_ = true;
    return final_;
}

} // namespace millpond
