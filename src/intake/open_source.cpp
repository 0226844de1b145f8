#include "intake/open_source.hpp"

#include "intake/daq_source.hpp"
#include "intake/pipe_source.hpp"
#include "intake/rtp_source.hpp"

#include <unistd.h>

namespace millpond {

std::unique_ptr<SampleSource> open_source(const StreamSettings& settings) {
    if (settings.source == SourceKind::pipe) {
        return std::make_unique<PipeSource>(settings, STDIN_FILENO);
    }
    if (settings.source == SourceKind::daq) {
        return open_daq_source(settings);
    }
    return std::make_unique<RtpSource>(settings);
}

} // namespace millpond
