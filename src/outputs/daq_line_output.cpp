#include "outputs/daq_line_output.hpp"

#include "base/refusal.hpp"

#ifdef MILLPOND_COMEDI
#include "outputs/device_file.hpp"
#include "outputs/library_line_output.hpp"

#include <comedilib.h>
#include <string>
#endif

namespace millpond {

#ifdef MILLPOND_COMEDI
namespace {

struct DaqLine {
    comedi_t* board = nullptr;
    unsigned subdevice = 0, channel = 0;
    bool level = false;
};

void check_line(const OutputSettings& settings, comedi_t* board) {
    const int type = comedi_get_subdevice_type(board, settings.subdevice);
    if (type != COMEDI_SUBD_DIO && type != COMEDI_SUBD_DO) {
        throw Refusal(settings.where("subdevice"), std::to_string(settings.subdevice),
                      "a subdevice of " + settings.device + " with digital outputs");
    }
    const int channels = comedi_get_n_channels(board, settings.subdevice);
    if (static_cast<int>(settings.channel) >= channels) {
        throw Refusal(settings.where("channel"), std::to_string(settings.channel),
                      "0 to " + std::to_string(channels - 1));
    }
    if (type == COMEDI_SUBD_DIO && comedi_dio_config(board, settings.subdevice, settings.channel, COMEDI_OUTPUT) < 0) {
        throw Refusal(settings.where("channel"),
                      std::to_string(settings.channel) + " (" + comedi_strerror(comedi_errno()) + ")",
                      "a line that can be an output");
    }
}

bool write_line(void* line, bool level) noexcept {
    auto* daq = static_cast<DaqLine*>(line);
    return comedi_dio_write(daq->board, daq->subdevice, daq->channel, level ? 1 : 0) == 1;
}

void close_line(void* line) noexcept {
    auto* daq = static_cast<DaqLine*>(line);
    comedi_close(daq->board);
    delete daq;
}

void* open_line(const OutputSettings& settings, bool level) {
    comedi_loglevel(0);
    auto* board = settings.device.empty() ? nullptr : comedi_open(settings.device.c_str());
    if (board == nullptr) {
        throw Refusal(settings.where("device"),
                      settings.device.empty() ? "nothing"
                                              : settings.device + " (" + comedi_strerror(comedi_errno()) + ")",
                      "a board of comedi that this user may open, such as /dev/comedi0");
    }
    auto* line = new DaqLine{board, settings.subdevice, settings.channel};
    try {
        check_line(settings, board);
        if (!write_line(line, level)) {
            throw Refusal(settings.where("channel"),
                          std::to_string(settings.channel) + " (" + comedi_strerror(comedi_errno()) + ")",
                          "a line that takes orders");
        }
    } catch (...) {
        close_line(line);
        throw;
    }
    return line;
}

bool line_answers(void* line) noexcept {
    auto* daq = static_cast<DaqLine*>(line);
    return comedi_get_subdevice_flags(daq->board, daq->subdevice) >= 0;
}

} // namespace

std::unique_ptr<Output> make_daq_line(const OutputSettings& settings) {
    return std::make_unique<LibraryLineOutput>(settings, LineLibrary{open_line, write_line, line_answers, close_line});
}
#else
std::unique_ptr<Output> make_daq_line(const OutputSettings& settings) {
    throw Refusal(settings.where("kind"), "daq_line, but this program was built without comedilib",
                  "another kind, or a program built where libcomedi-dev is installed");
}
#endif

} // namespace millpond
