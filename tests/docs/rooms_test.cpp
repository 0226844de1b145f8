// Who knows whom: src/CMakeLists.txt is the table, #include lines must obey it, src/README.md must show it all.
#include "docs/documents.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <map>

namespace millpond::testing {
namespace {

const std::filesystem::path source = source_folder / "src";

struct Room {
    std::string name;
    std::set<std::string> may_know; ///< itself, base, and the rooms that it is linked to
};

/// In the order of src/CMakeLists.txt.
const std::vector<Room>& rooms() {
    static const auto all = [] {
        std::vector<Room> found;
        const auto table = text_of(source / "CMakeLists.txt");
        const std::regex row("\nmillpond_room\\(([a-z]+)([^)]*)\\)");
        for (std::sregex_iterator match(table.begin(), table.end(), row), none; match != none; ++match) {
            Room room{(*match)[1].str(), all_matches((*match)[2].str(), "millpond_([a-z]+)", 1)};
            room.may_know.insert({room.name, "base"});
            found.push_back(std::move(room));
        }
        return found;
    }();
    return all;
}

/// Files of a room with the rooms that each includes: `settings/settings.hpp` gives room settings.
std::map<std::string, std::set<std::string>> includes_of(const std::string& room) {
    std::map<std::string, std::set<std::string>> found;
    for (const auto& entry : std::filesystem::directory_iterator(source / room)) {
        if (entry.path().extension() != ".md") {
            found[room + "/" + entry.path().filename().string()] =
                all_matches(text_of(entry.path()), "\n#include \"([a-z_]+/[a-z0-9_]+\\.[a-z]+)\"", 1);
        }
    }
    return found;
}

std::string room_of(const std::string& header) {
    return header.substr(0, header.find('/'));
}

// The room settings joins what every room says of its own settings: plain structs, nothing to link.
bool is_a_rooms_settings(const std::string& room, const std::string& header) {
    return room == "settings" && header.ends_with("_settings.hpp");
}

TEST(Rooms, EveryFolderOfSrcIsARoom) {
    std::set<std::string> folders, listed;
    for (const auto& entry : std::filesystem::directory_iterator(source)) {
        if (entry.is_directory()) {
            folders.insert(entry.path().filename().string());
        }
    }
    for (const auto& room : rooms()) {
        listed.insert(room.name);
    }
    EXPECT_EQ(listed, folders);
}

TEST(Rooms, KnowOnlyThemselvesBaseAndTheRoomsTheyAreLinkedTo) {
    for (const auto& room : rooms()) {
        for (const auto& [file, headers] : includes_of(room.name)) {
            for (const auto& header : headers) {
                EXPECT_TRUE(room.may_know.count(room_of(header)) > 0 || is_a_rooms_settings(room.name, header))
                    << "src/" << file << " includes " << header << "; src/CMakeLists.txt does not link " << room.name
                    << " to it";
            }
        }
    }
}

TEST(Rooms, AreLinkedToNoRoomThatTheyDoNotUse) {
    for (const auto& room : rooms()) {
        std::set<std::string> used{room.name, "base"};
        for (const auto& [file, headers] : includes_of(room.name)) {
            std::transform(headers.begin(), headers.end(), std::inserter(used, used.end()), room_of);
        }
        for (const auto& known : room.may_know) {
            EXPECT_TRUE(used.count(known) > 0)
                << room.name << " is linked to " << known << " and includes nothing of it";
        }
    }
}

TEST(Rooms, AreLinkedToEarlierRoomsOnly) {
    std::set<std::string> earlier;
    for (const auto& room : rooms()) {
        for (const auto& known : room.may_know) {
            EXPECT_TRUE(known == room.name || earlier.count(known) > 0 || known == "base")
                << room.name << " knows " << known;
        }
        earlier.insert(room.name);
    }
}

TEST(Rooms, StandInTheMapEach) {
    const auto map = text_of(source / "README.md");
    for (const auto& room : rooms()) {
        EXPECT_TRUE(has(map, "| `" + room.name + "` |")) << "src/README.md has no row for " << room.name;
    }
}

} // namespace
} // namespace millpond::testing
