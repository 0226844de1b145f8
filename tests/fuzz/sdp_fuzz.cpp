// Any text as a session description: refused, or taken and written so that it reads back as the same.
#include "base/refusal.hpp"
#include "intake/sdp.hpp"

#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <string_view>

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    const std::string_view text(reinterpret_cast<const char*>(data), size);
    try {
        const auto stream = millpond::parse_sdp(text, "fuzzed.sdp");
        if (!(millpond::parse_sdp(millpond::write_sdp(stream, "-", ""), "written.sdp") == stream)) {
            std::abort();
        }
    } catch (const millpond::Refusal&) {
    }
    return 0;
}
