#include "intake/daq_source.hpp"

#include "base/refusal.hpp"

#ifdef MILLPOND_COMEDI
#include "intake/count_source.hpp"

#include <cmath>
#include <comedilib.h>
#include <fcntl.h>
#include <string>
#include <utility>
#include <vector>
#endif

namespace millpond {

#ifdef MILLPOND_COMEDI
namespace {

constexpr double most_drift = 1e-4; // of the rate; a board's clock knows some steps only

std::string why() {
    return comedi_strerror(comedi_errno());
}

// A board times each frame, or each sample of a frame with the frames one after another.
double frame_period_ns(const comedi_cmd& command) {
    return command.scan_begin_src == TRIG_TIMER ? command.scan_begin_arg
                                                : static_cast<double>(command.convert_arg) * command.chanlist_len;
}

/// An open board; closing it stops its clock.
class Board {
  public:
    explicit Board(const StreamSettings& settings) : settings_(settings) {
        comedi_loglevel(0);
        device_ = comedi_open(settings.device.c_str());
        if (device_ == nullptr) {
            throw Refusal("stream.device", settings.device + " (" + why() + ")",
                          "a board of comedi that this user may open, such as /dev/comedi0");
        }
    }
    ~Board() {
        if (device_ != nullptr) {
            comedi_close(device_);
        }
    }
    Board(Board&& other) noexcept : settings_(other.settings_), device_(std::exchange(other.device_, nullptr)) {}
    Board(const Board&) = delete;
    Board& operator=(const Board&) = delete;

    /// Checks the settings against the board, and gives what its counts are worth.
    CountFormat format() {
        const unsigned subdevice = settings_.subdevice;
        const int flags = comedi_get_subdevice_flags(device_, subdevice);
        if (comedi_get_subdevice_type(device_, subdevice) != COMEDI_SUBD_AI || (flags & SDF_CMD_READ) == 0) {
            throw Refusal("stream.subdevice", std::to_string(subdevice), "one that streams analogue input");
        }
        const int channels = comedi_get_n_channels(device_, subdevice);
        if (static_cast<int>(settings_.channels) > channels) {
            throw Refusal("stream.channels", std::to_string(settings_.channels),
                          "at most " + std::to_string(channels) + ", as the board has");
        }
        CountFormat format{{settings_.rate_hz}, {}, (flags & SDF_LSAMPL) != 0 ? 4U : 2U};
        for (unsigned channel = 0; channel < settings_.channels; ++channel) {
            format.channels.push_back(scale(channel));
        }
        return format;
    }

    void start() {
        for (unsigned channel = 0; channel < settings_.channels; ++channel) {
            list_.push_back(CR_PACK(channel, settings_.range, AREF_GROUND));
        }
        const double period_ns = 1e9 / settings_.rate_hz;
        comedi_cmd command{};
        if (comedi_get_cmd_generic_timed(device_, settings_.subdevice, &command, settings_.channels,
                                         static_cast<unsigned>(std::lround(period_ns))) < 0) {
            throw Refusal("stream.rate_hz", std::to_string(settings_.rate_hz) + " (" + why() + ")",
                          "a rate that the board's clock can keep");
        }
        command.chanlist = list_.data();
        command.chanlist_len = settings_.channels;
        command.stop_src = TRIG_NONE;
        command.stop_arg = 0;
        command.flags |= CMDF_WAKE_EOS; // wakes the loop at each frame, not at each half of its buffer
        for (int i = 0; i < 3; ++i) {
            comedi_command_test(device_, &command); // each call mends one more of what the board cannot do
        }
        const double kept_ns = frame_period_ns(command);
        if (!(std::abs(kept_ns - period_ns) <= most_drift * period_ns)) {
            throw Refusal("stream.rate_hz", std::to_string(settings_.rate_hz),
                          std::to_string(1e9 / kept_ns) + ", the nearest that the board's clock can keep");
        }
        if (::fcntl(descriptor(), F_SETFL, O_NONBLOCK) != 0 || comedi_command(device_, &command) < 0) {
            throw Refusal("stream.device", settings_.device + " (" + why() + ")", "a board that is free and streams");
        }
    }

    [[nodiscard]] int descriptor() const { return comedi_fileno(device_); }

  private:
    CountScale scale(unsigned channel) {
        const auto* range = comedi_get_range(device_, settings_.subdevice, channel, settings_.range);
        const auto most = comedi_get_maxdata(device_, settings_.subdevice, channel);
        if (range == nullptr || range->unit != UNIT_volt || most == 0) {
            throw Refusal("stream.range", std::to_string(settings_.range), "a range of the board in volts");
        }
        const double to_uv = 1e6 / settings_.gain;
        return {static_cast<float>(range->min * to_uv),
                static_cast<float>((range->max - range->min) * to_uv / static_cast<double>(most))};
    }

    StreamSettings settings_;
    comedi_t* device_ = nullptr;
    std::vector<unsigned> list_;
};

class DaqSource final : public CountSource {
  public:
    DaqSource(Board board, CountFormat format)
        : CountSource(std::move(format), board.descriptor()), board_(std::move(board)) {}

  private:
    Board board_;
};

} // namespace

std::unique_ptr<SampleSource> open_daq_source(const StreamSettings& settings) {
    Board board(settings);
    auto format = board.format();
    board.start();
    return std::make_unique<DaqSource>(std::move(board), std::move(format));
}
#else
std::unique_ptr<SampleSource> open_daq_source(const StreamSettings& /*settings*/) {
    throw Refusal("stream.source", "daq, but this program was built without comedilib",
                  "another source, or a program built where libcomedi-dev is installed");
}
#endif

} // namespace millpond
