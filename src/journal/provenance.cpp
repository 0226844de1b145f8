#include "journal/provenance.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <ctime>
#include <fstream>
#include <sys/utsname.h>

namespace millpond {
namespace {

std::string first_line(const char* file) {
    std::ifstream in(file);
    std::string line;
    return std::getline(in, line) ? line : "unknown";
}

std::string cpu_model() {
    std::ifstream in("/proc/cpuinfo");
    for (std::string line; std::getline(in, line);) {
        if (line.starts_with("model name")) {
            const auto colon = line.find(": ");
            return colon == std::string::npos ? line : line.substr(colon + 2);
        }
    }
    return "unknown";
}

nlohmann::json floors_to_json(const std::vector<FloorDetail>& floors) {
    auto list = nlohmann::json::array();
    for (const auto& floor : floors) {
        list.push_back({{"site", floor.site},
                        {"mean_uv", floor.mean},
                        {"deviation_uv", floor.deviation},
                        {"frames", floor.frames}});
    }
    return list;
}

ChannelRole role_of(const std::string& word) {
    for (const auto& choice : channel_roles) {
        if (choice.word == word) {
            return choice.value;
        }
    }
    return ChannelRole::unused;
}

Provenance from_json(const nlohmann::json& json) {
    Provenance provenance;
    auto& about = provenance.about;
    about.program = json.at("program");
    about.rate = Hertz{json.at("rate_hz")};
    for (const auto& channel : json.at("channels")) {
        about.channels.push_back({channel.at("name"), role_of(channel.at("role"))});
    }
    about.floor_count = json.at("floor_count");
    about.kernel_width = json.at("kernel_width");
    about.filter_delay_samples = json.at("filter_delay_samples");
    about.delay_samples = json.at("delay_samples");
    for (const auto& floor : json.at("warm_start")) {
        about.warm_start.push_back(
            {floor.at("mean_uv"), floor.at("deviation_uv"), 0.0F, floor.at("site"), 0, floor.at("frames")});
    }
    about.more = json.at("more");
    provenance.machine = json.at("machine");
    provenance.kernel = json.at("kernel");
    provenance.cpu = json.at("cpu");
    provenance.clock_source = json.at("clock_source");
    provenance.start_utc_ns = json.at("start_utc_ns");
    return provenance;
}

} // namespace

std::string utc_text(std::int64_t utc_ns, bool compact) {
    const auto seconds = static_cast<std::time_t>(utc_ns / 1'000'000'000);
    std::tm utc{};
    gmtime_r(&seconds, &utc);
    const auto pattern = compact ? "{:04}{:02}{:02}T{:02}{:02}{:02}" : "{:04}-{:02}-{:02}T{:02}:{:02}:{:02}";
    const auto text = fmt::format(fmt::runtime(pattern), utc.tm_year + 1900, utc.tm_mon + 1, utc.tm_mday, utc.tm_hour,
                                  utc.tm_min, utc.tm_sec);
    return compact ? text + "Z" : fmt::format("{}.{:06}Z", text, utc_ns % 1'000'000'000 / 1000);
}

Provenance gather_provenance(const SessionAbout& about, std::int64_t start_utc_ns) {
    Provenance provenance;
    provenance.about = about;
    utsname system{};
    uname(&system);
    provenance.machine = system.nodename;
    provenance.kernel = fmt::format("{} {} {}", system.sysname, system.release, system.machine);
    provenance.cpu = cpu_model();
    provenance.clock_source = first_line("/sys/devices/system/clocksource/clocksource0/current_clocksource");
    provenance.start_utc_ns = start_utc_ns;
    return provenance;
}

nlohmann::json to_json(const Provenance& provenance) {
    const auto& about = provenance.about;
    auto channels = nlohmann::json::array();
    for (const auto& channel : about.channels) {
        channels.push_back({{"name", channel.name},
                            {"role", word_for(std::span<const Choice<ChannelRole>>(channel_roles), channel.role)}});
    }
    return {{"program", about.program},
            {"machine", provenance.machine},
            {"kernel", provenance.kernel},
            {"cpu", provenance.cpu},
            {"clock_source", provenance.clock_source},
            {"start_utc", utc_text(provenance.start_utc_ns)},
            {"start_utc_ns", provenance.start_utc_ns},
            {"rate_hz", about.rate.value},
            {"channels", channels},
            {"floor_count", about.floor_count},
            {"kernel_width", about.kernel_width},
            {"filter_delay_samples", about.filter_delay_samples},
            {"delay_samples", about.delay_samples},
            {"warm_start", floors_to_json(about.warm_start)},
            {"more", about.more}};
}

Provenance read_provenance(const std::filesystem::path& file) {
    std::ifstream in(file);
    if (!in) {
        throw Refusal(file.string(), "no file that can be read", "the provenance.json of a session");
    }
    try {
        auto provenance = from_json(nlohmann::json::parse(in));
        if (!(provenance.about.rate.value > 0.0) || provenance.about.channels.empty()) {
            throw Refusal(file.string(), "a stream without rate or channels",
                          "rate_hz above 0 and at least one channel");
        }
        return provenance;
    } catch (const nlohmann::json::exception& trouble) {
        throw Refusal(file.string(), trouble.what(), "the provenance.json of a session, as the program wrote it");
    }
}

} // namespace millpond
