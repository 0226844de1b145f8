#include "intake/stream_settings.hpp"

#include "base/refusal.hpp"
#include "intake/sdp.hpp"

#include <boost/asio/ip/address_v4.hpp>

#include <sstream>

namespace millpond {
namespace {

std::string shown(const std::string& text) {
    return text;
}
std::string shown(SampleEncoding encoding) {
    return std::string(word_for<SampleEncoding>(sample_encodings, encoding));
}
template <class Number> std::string shown(Number value) {
    std::ostringstream out;
    out << +value;
    return out.str();
}

class Resolver {
  public:
    Resolver(StreamSettings& settings, const std::filesystem::path& file) : settings_(settings), file_(file) {}

    void resolve() {
        if (settings_.source == SourceKind::rtp) {
            resolve_rtp();
        } else if (settings_.source == SourceKind::pipe) {
            resolve_pipe();
        } else {
            resolve_daq();
        }
        if (!(settings_.rate_hz >= 500.0)) {
            refuse("rate_hz", shown(settings_.rate_hz), "from 500 to 50000");
        }
        if (settings_.channels == 0) {
            refuse("channels", "0", "from 1 to 256");
        }
        if (settings_.source != SourceKind::daq && settings_.encoding != SampleEncoding::float32 &&
            settings_.microvolts_per_count == 0.0) {
            refuse("microvolts_per_count", "0", "what one count of the sender's integers is worth");
        }
    }

  private:
    [[noreturn]] void refuse(const std::string& key, const std::string& found, const std::string& allowed) const {
        throw Refusal(file_.string() + ": stream." + key, found, allowed);
    }

    /// `said` where the settings leave it open; refuses where they say something else.
    template <class Value> void take(const char* key, Value& setting, Value unsaid, Value said) const {
        if (setting != unsaid && setting != said) {
            refuse(key, shown(setting), shown(said) + ", as " + settings_.sdp_file + " says, or nothing here");
        }
        setting = said;
    }

    void take_sdp() {
        const std::filesystem::path sdp_file = file_.parent_path() / settings_.sdp_file;
        const auto sdp = read_sdp_file(sdp_file);
        take("listen_address", settings_.listen_address, std::string{}, sdp.address);
        take("port", settings_.port, std::uint16_t{0}, sdp.port);
        take("payload_type", settings_.payload_type, std::uint8_t{0}, sdp.payload_type);
        take("encoding", settings_.encoding, SampleEncoding::from_sdp, sdp.encoding);
        if (sdp.rate_hz > 50000 || sdp.rate_hz < 500) {
            throw Refusal(sdp_file.string(), std::to_string(sdp.rate_hz) + " frames a second", "from 500 to 50000");
        }
        take("rate_hz", settings_.rate_hz, 0.0, static_cast<double>(sdp.rate_hz));
        take("channels", settings_.channels, std::uint32_t{0}, static_cast<std::uint32_t>(sdp.channels));
        if (sdp.send_time_id != 0) {
            take("send_time_extension", settings_.send_time_extension, std::uint8_t{0}, sdp.send_time_id);
        }
    }

    void resolve_rtp() {
        if (!settings_.sdp_file.empty()) {
            take_sdp();
        }
        if (settings_.listen_address.empty()) {
            settings_.listen_address = "127.0.0.1";
        }
        if (settings_.payload_type == 0) {
            settings_.payload_type = 96;
        }
        check_address();
        if (settings_.port == 0) {
            refuse("port", "0", "from 1 to 65535, or an sdp_file that says it");
        }
        if (settings_.encoding != SampleEncoding::l16 && settings_.encoding != SampleEncoding::l24) {
            refuse("encoding", shown(settings_.encoding), "L16 or L24 (source: rtp), or an sdp_file that says it");
        }
        if (settings_.send_time_extension == 15) {
            refuse("send_time_extension", "15", "0 to 14 or 16 to 255 (RFC 8285 keeps 15)");
        }
    }

    void check_address() const {
        boost::system::error_code trouble;
        const auto address = boost::asio::ip::make_address_v4(settings_.listen_address.c_str(), trouble);
        if (trouble || address.is_multicast()) {
            refuse("listen_address", "'" + settings_.listen_address + "'", "a dotted IPv4 address of this computer");
        }
        if (!address.is_loopback() && !settings_.allow_other_hosts) {
            refuse("listen_address", settings_.listen_address,
                   "127.0.0.1, or allow_other_hosts: true where packets of other computers are wanted");
        }
    }

    void resolve_pipe() const {
        if (!settings_.sdp_file.empty()) {
            refuse("sdp_file", settings_.sdp_file, "nothing (source: pipe)");
        }
        if (settings_.encoding != SampleEncoding::int16 && settings_.encoding != SampleEncoding::float32) {
            refuse("encoding", shown(settings_.encoding), "int16 or float32 (source: pipe)");
        }
    }

    void resolve_daq() const {
        if (!settings_.sdp_file.empty()) {
            refuse("sdp_file", settings_.sdp_file, "nothing (source: daq)");
        }
        if (settings_.device.empty()) {
            refuse("device", "nothing", "the path of a board, such as /dev/comedi0 (source: daq)");
        }
        if (settings_.encoding != SampleEncoding::from_sdp) {
            refuse("encoding", shown(settings_.encoding), "nothing (source: daq): the board says what its counts are");
        }
        if (settings_.microvolts_per_count != 0.0 && settings_.microvolts_per_count != 1.0) {
            refuse("microvolts_per_count", shown(settings_.microvolts_per_count),
                   "nothing (source: daq): the board's range and gain say it");
        }
        if (settings_.gain == 0.0) {
            refuse("gain", "0", "the gain of the amplifier before the board, 1 where there is none (source: daq)");
        }
    }

    StreamSettings& settings_;
    const std::filesystem::path& file_;
};

} // namespace

StreamSettings resolved(StreamSettings settings, const std::filesystem::path& settings_file) {
    Resolver(settings, settings_file).resolve();
    if (settings.microvolts_per_count == 0.0) {
        settings.microvolts_per_count = 1.0;
    }
    return settings;
}

} // namespace millpond
