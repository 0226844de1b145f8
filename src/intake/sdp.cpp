#include "intake/sdp.hpp"

#include "base/refusal.hpp"

#include <boost/asio/ip/address_v4.hpp>

#include <algorithm>
#include <charconv>
#include <fstream>
#include <optional>
#include <sstream>
#include <vector>

namespace millpond {
namespace {

constexpr std::size_t greatest_file_bytes = 65536;

struct Line {
    std::size_t number;
    char type;
    std::string_view value;
};

struct RtpMap {
    std::uint8_t payload_type;
    SampleEncoding encoding;
    std::uint32_t rate_hz;
    std::size_t channels;
};

class Parser {
  public:
    Parser(std::string_view text, const std::string& name) : name_(name) { split(text); }

    SdpStream parse() {
        const auto media = find_media();
        SdpStream stream;
        const auto payload_types = read_media(lines_[media], stream);
        read_connection(media, stream);
        pick_format(media, payload_types, stream);
        read_send_time(stream);
        return stream;
    }

  private:
    [[noreturn]] void refuse(const Line& line, std::string_view found, std::string_view allowed) const {
        throw Refusal(name_ + ":" + std::to_string(line.number), found, allowed);
    }

    void split(std::string_view text) {
        std::size_t number = 0;
        while (!text.empty()) {
            const auto end = text.find('\n');
            auto line = text.substr(0, end);
            text.remove_prefix(end == std::string_view::npos ? text.size() : end + 1);
            ++number;
            if (line.ends_with('\r')) {
                line.remove_suffix(1);
            }
            if (line.empty() || (lines_.empty() && line == "SDP:")) {
                continue;
            }
            if (line.size() < 2 || line[1] != '=') {
                refuse({number, ' ', {}}, quoted(line), "lines of the form type=value");
            }
            lines_.push_back({number, line[0], line.substr(2)});
        }
        if (lines_.empty() || lines_[0].type != 'v' || lines_[0].value != "0") {
            throw Refusal(name_ + ":1", "no v=0", "a session description, which begins with v=0");
        }
    }

    static std::string quoted(std::string_view found) {
        std::string text(1, '\'');
        text.append(found.substr(0, 60)).push_back('\'');
        return text;
    }

    static std::vector<std::string_view> words(std::string_view value, char between = ' ') {
        std::vector<std::string_view> found;
        while (!value.empty()) {
            const auto end = value.find(between);
            if (end != 0) {
                found.push_back(value.substr(0, end));
            }
            value.remove_prefix(end == std::string_view::npos ? value.size() : end + 1);
        }
        return found;
    }

    static std::optional<std::uint32_t> whole(std::string_view word, std::uint32_t least, std::uint32_t most) {
        std::uint32_t value = 0;
        const auto [end, trouble] = std::from_chars(word.data(), word.data() + word.size(), value);
        if (trouble != std::errc{} || end != word.data() + word.size() || value < least || value > most) {
            return std::nullopt;
        }
        return value;
    }

    std::size_t find_media() const {
        std::optional<std::size_t> found;
        for (std::size_t i = 0; i < lines_.size(); ++i) {
            if (lines_[i].type != 'm') {
                continue;
            }
            if (found) {
                refuse(lines_[i], "a second m= line", "one stream");
            }
            found = i;
        }
        if (!found) {
            throw Refusal(name_, "no m= line", "one line m=audio PORT RTP/AVP TYPE");
        }
        return *found;
    }

    std::vector<std::uint8_t> read_media(const Line& line, SdpStream& stream) const {
        constexpr std::string_view allowed = "m=audio PORT RTP/AVP TYPE, port 1 to 65535, types 0 to 127";
        const auto parts = words(line.value);
        if (parts.size() < 4 || parts[0] != "audio" || parts[2] != "RTP/AVP") {
            refuse(line, quoted(line.value), allowed);
        }
        const auto port = whole(parts[1], 1, 65535);
        if (!port) {
            refuse(line, "port " + quoted(parts[1]), allowed);
        }
        stream.port = static_cast<std::uint16_t>(*port);
        std::vector<std::uint8_t> types;
        for (std::size_t i = 3; i < parts.size(); ++i) {
            const auto type = whole(parts[i], 0, 127);
            if (!type) {
                refuse(line, "payload type " + quoted(parts[i]), allowed);
            }
            types.push_back(static_cast<std::uint8_t>(*type));
        }
        return types;
    }

    // RFC 8866, 5.7: the one of the media part stands above the one of the session part.
    void read_connection(std::size_t media, SdpStream& stream) const {
        const Line* connection = nullptr;
        for (const auto& line : lines_) {
            if (line.type == 'c') {
                connection = &line;
            }
        }
        constexpr std::string_view allowed = "c=IN IP4 and a dotted address that is no multicast group";
        if (connection == nullptr) {
            refuse(lines_[media], "no c= line", allowed);
        }
        const auto parts = words(connection->value);
        boost::system::error_code trouble;
        const auto address =
            boost::asio::ip::make_address_v4(parts.size() == 3 ? std::string(parts[2]).c_str() : "", trouble);
        if (parts.size() != 3 || parts[0] != "IN" || parts[1] != "IP4" || trouble || address.is_multicast()) {
            refuse(*connection, quoted(connection->value), allowed);
        }
        stream.address = address.to_string();
    }

    static std::optional<SampleEncoding> encoding_named(std::string_view name) {
        if (name.size() == 3 && (name[0] == 'L' || name[0] == 'l')) { // media subtypes know no case (RFC 8866, 6.6)
            if (name.substr(1) == "16") {
                return SampleEncoding::l16;
            }
            if (name.substr(1) == "24") {
                return SampleEncoding::l24;
            }
        }
        return std::nullopt;
    }

    /// Nothing for an encoding that is not ours.
    std::optional<RtpMap> read_rtpmap(const Line& line) const {
        constexpr std::string_view allowed = "a=rtpmap:TYPE L16/RATE/CHANNELS or L24/RATE/CHANNELS, 1 to 256 channels";
        const auto parts = words(line.value.substr(std::string_view("rtpmap:").size()));
        const auto format = parts.size() == 2 ? words(parts[1], '/') : std::vector<std::string_view>{};
        const auto type = parts.empty() ? std::nullopt : whole(parts[0], 0, 127);
        if (!type || format.size() < 2) {
            refuse(line, quoted(line.value), allowed);
        }
        const auto encoding = encoding_named(format[0]);
        if (!encoding) {
            return std::nullopt;
        }
        const auto rate = whole(format[1], 1, 1'000'000);
        const auto channels = format.size() == 2 ? std::optional<std::uint32_t>{1} : whole(format[2], 1, 256);
        if (!rate || !channels || format.size() > 3) {
            refuse(line, quoted(line.value), allowed);
        }
        return RtpMap{static_cast<std::uint8_t>(*type), *encoding, *rate, *channels};
    }

    void pick_format(std::size_t media, const std::vector<std::uint8_t>& payload_types, SdpStream& stream) const {
        std::vector<RtpMap> known{{10, SampleEncoding::l16, 44100, 2}, {11, SampleEncoding::l16, 44100, 1}};
        for (std::size_t i = media; i < lines_.size(); ++i) {
            if (lines_[i].type == 'a' && lines_[i].value.starts_with("rtpmap:")) {
                if (const auto map = read_rtpmap(lines_[i]); map) {
                    known.insert(known.begin(), *map); // what the file says stands above the static types
                }
            }
        }
        for (const auto type : payload_types) {
            for (const auto& map : known) {
                if (map.payload_type == type && type != 0) { // 0 is PCMU for good (RFC 3551, table 4)
                    stream.payload_type = type;
                    stream.encoding = map.encoding;
                    stream.rate_hz = map.rate_hz;
                    stream.channels = map.channels;
                    return;
                }
            }
        }
        refuse(lines_[media], quoted(lines_[media].value),
               "a payload type 10 or 11, or one with a=rtpmap:TYPE L16/RATE/CHANNELS or L24/RATE/CHANNELS");
    }

    void read_send_time(SdpStream& stream) const {
        for (const auto& line : lines_) {
            constexpr std::string_view attribute = "extmap:";
            if (line.type != 'a' || !line.value.starts_with(attribute)) {
                continue;
            }
            const auto parts = words(line.value.substr(attribute.size()));
            if (parts.size() < 2 || parts[1] != ntp64_extension_uri) {
                continue;
            }
            const auto id = whole(parts[0].substr(0, parts[0].find('/')), 1, 255); // ID or ID/direction
            if (!id || *id == 15) {
                refuse(line, quoted(parts[0]), "an extension number from 1 to 14 or from 16 to 255");
            }
            stream.send_time_id = static_cast<std::uint8_t>(*id);
        }
    }

    const std::string& name_;
    std::vector<Line> lines_;
};

} // namespace

SdpStream parse_sdp(std::string_view text, const std::string& name) {
    if (text.size() > greatest_file_bytes) {
        throw Refusal(name, std::to_string(text.size()) + " bytes", "a session description of at most 65536 bytes");
    }
    return Parser(text, name).parse();
}

SdpStream read_sdp_file(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    std::ostringstream text;
    if (!in || !(text << in.rdbuf())) {
        throw Refusal(file.string(), "no file that can be read", "a session description (SDP) file");
    }
    return parse_sdp(text.str(), file.string());
}

std::string write_sdp(const SdpStream& stream, std::string_view session_name, std::string_view information) {
    const auto type = std::to_string(stream.payload_type);
    std::ostringstream out;
    out << "v=0\r\n"
        << "o=- 0 0 IN IP4 " << stream.address << "\r\n"
        << "s=" << session_name << "\r\n";
    if (!information.empty()) {
        out << "i=" << information << "\r\n";
    }
    out << "c=IN IP4 " << stream.address << "\r\n"
        << "t=0 0\r\n"
        << "m=audio " << stream.port << " RTP/AVP " << type << "\r\n"
        << "a=rtpmap:" << type << ' ' << (stream.encoding == SampleEncoding::l24 ? "L24/" : "L16/") << stream.rate_hz
        << '/' << stream.channels << "\r\n";
    if (stream.send_time_id != 0) {
        out << "a=extmap:" << static_cast<int>(stream.send_time_id) << ' ' << ntp64_extension_uri << "\r\n";
    }
    return out.str();
}

} // namespace millpond
