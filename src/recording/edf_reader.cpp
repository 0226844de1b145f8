#include "recording/edf_reader.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <edflib.h>
#include <fstream>
#include <map>
#include <mutex>

namespace millpond {
namespace {

std::mutex edflib_lock;

std::string trimmed(const char* padded) {
    std::string text(padded);
    text.erase(text.find_last_not_of(' ') + 1);
    text.erase(0, text.find_first_not_of(' '));
    return text;
}

const char* trouble_of(int error) {
    switch (error) {
    case EDFLIB_FILE_CONTAINS_FORMAT_ERRORS:
        return "a file that is not as EDF+ prescribes, or cut short";
    case EDFLIB_FILE_IS_DISCONTINUOUS:
        return "an interrupted recording (EDF+D)";
    case EDFLIB_MAXFILES_REACHED:
        return "too many EDF+ files open at once";
    case EDFLIB_FILE_READ_ERROR:
        return "a file that cannot be read to its end";
    default:
        return "a file that EDFlib does not open";
    }
}

/// One file as EDFlib has it open, shared by all who read it at the time.
struct OpenEdf {
    edf_hdr_struct header{};
    int users = 0;
};

/// By canonical path. Guarded by edflib_lock, as is the opening and closing itself.
std::map<std::string, std::unique_ptr<OpenEdf>> open_edfs;

class EdfFile {
  public:
    explicit EdfFile(const std::filesystem::path& recording) : key_(std::filesystem::canonical(recording).string()) {
        const std::lock_guard guard(edflib_lock);
        auto& entry = open_edfs[key_];
        if (!entry) {
            auto opened = std::make_unique<OpenEdf>();
            if (edfopen_file_readonly(key_.c_str(), &opened->header, EDFLIB_READ_ALL_ANNOTATIONS) != 0) {
                open_edfs.erase(key_);
                throw Refusal(key_, trouble_of(opened->header.filetype), "a continuous EDF or EDF+ recording");
            }
            entry = std::move(opened);
        }
        ++entry->users;
        open_ = entry.get();
    }

    ~EdfFile() {
        const std::lock_guard guard(edflib_lock);
        if (--open_->users == 0) {
            edfclose_file(open_->header.handle);
            open_edfs.erase(key_);
        }
    }
    EdfFile(const EdfFile&) = delete;
    EdfFile& operator=(const EdfFile&) = delete;

    [[nodiscard]] const edf_hdr_struct& header() const noexcept { return open_->header; }

    /// Physical values from `place` on; false where the file does not give them.
    bool read(int signal, std::uint64_t place, std::span<double> out) {
        const std::lock_guard guard(edflib_lock);
        const int handle = open_->header.handle;
        const auto count = static_cast<int>(out.size());
        return edfseek(handle, signal, static_cast<long long>(place), EDFSEEK_SET) >= 0 &&
               edfread_physical_samples(handle, signal, count, out.data()) == count;
    }

    [[nodiscard]] std::vector<edf_annotation_struct> annotations() {
        const std::lock_guard guard(edflib_lock);
        std::vector<edf_annotation_struct> all(static_cast<std::size_t>(open_->header.annotations_in_file));
        for (std::size_t i = 0; i < all.size(); ++i) {
            edf_get_annotation(open_->header.handle, static_cast<int>(i), &all[i]);
        }
        return all;
    }

  private:
    std::string key_;
    OpenEdf* open_ = nullptr;
};

struct Signal {
    int number; ///< in EDFlib's order
    double rate_hz;
    std::uint64_t samples;
    double microvolts_per_physical; ///< 0: not a voltage
    std::string unit;
    Channel channel;
};

double microvolts_per(const std::string& unit) {
    static const std::map<std::string, double> known{{"uV", 1.0}, {"mV", 1e3}, {"V", 1e6}};
    const auto found = known.find(unit);
    return found == known.end() ? 0.0 : found->second;
}

std::vector<Signal> signals_of(const edf_hdr_struct& header) {
    std::vector<Signal> signals;
    const double record_s = static_cast<double>(header.datarecord_duration) / EDFLIB_TIME_DIMENSION;
    for (int i = 0; i < header.edfsignals; ++i) {
        const auto& parameters = header.signalparam[i];
        const auto unit = trimmed(parameters.physdimension);
        signals.push_back({i, parameters.smp_in_datarecord / record_s,
                           static_cast<std::uint64_t>(parameters.smp_in_file), microvolts_per(unit), unit,
                           Channel{trimmed(parameters.label), ChannelRole::ripple}});
    }
    return signals;
}

void take_channels(std::vector<Signal>& signals, const Sidecar& sidecar, const std::string& sidecar_name) {
    if (sidecar.channels.empty()) {
        return;
    }
    const auto labelled = [&](const std::string& name) {
        return std::count_if(signals.begin(), signals.end(), [&](const Signal& s) { return s.channel.name == name; });
    };
    const auto known = std::count_if(sidecar.channels.begin(), sidecar.channels.end(),
                                     [&](const Channel& channel) { return labelled(channel.name) == 1; });
    if (known == 0 && sidecar.channels.size() == signals.size()) {
        for (std::size_t i = 0; i < signals.size(); ++i) {
            signals[i].channel = sidecar.channels[i];
        }
        return;
    }
    for (auto& signal : signals) {
        signal.channel.role = ChannelRole::unused;
    }
    for (const auto& channel : sidecar.channels) {
        if (labelled(channel.name) != 1) {
            std::vector<std::string> labels;
            for (const auto& signal : signals) {
                labels.push_back(signal.channel.name);
            }
            throw Refusal(sidecar_name + ": channels", "'" + channel.name + "'",
                          fmt::format("labels that one signal has each ({}), or a name for each of the {} signals",
                                      fmt::join(labels, ", "), signals.size()));
        }
        std::find_if(signals.begin(), signals.end(), [&](const Signal& s) {
            return s.channel.name == channel.name;
        })->channel.role = channel.role;
    }
}

/// Refuses used signals that do not fit together; leaves out unused ones that do not fit the used ones.
std::vector<Signal> fitting(std::vector<Signal> signals, const std::string& where) {
    const auto used = [](const Signal& signal) { return signal.channel.role != ChannelRole::unused; };
    const auto first = std::find_if(signals.begin(), signals.end(), used);
    if (first == signals.end()) {
        throw Refusal(where, "no signal in use", "at least one signal of role ripple or reference");
    }
    const auto rate = first->rate_hz;
    const auto first_name = first->channel.name;
    for (const auto& signal : signals) {
        if (used(signal) && signal.rate_hz != rate) {
            throw Refusal(where + ": signal '" + signal.channel.name + "'", fmt::format("{} Hz", signal.rate_hz),
                          fmt::format("{} Hz as of '{}', or role unused in the sidecar", rate, first_name));
        }
        if (used(signal) && signal.microvolts_per_physical == 0.0) {
            throw Refusal(where + ": signal '" + signal.channel.name + "'", "unit '" + signal.unit + "'",
                          "uV, mV or V, or role unused in the sidecar");
        }
    }
    std::erase_if(signals, [rate](const Signal& s) { return s.rate_hz != rate || s.microvolts_per_physical == 0.0; });
    return signals;
}

const char* format_name(int filetype) {
    static constexpr std::array<const char*, 4> names{"EDF", "EDF+", "BDF", "BDF+"};
    return names.at(static_cast<std::size_t>(filetype));
}

class EdfReader : public RecordingReader {
  public:
    EdfReader(const std::filesystem::path& recording, const Sidecar& sidecar, const std::string& sidecar_name)
        : recording_(recording), file_(recording) {
        if (sidecar.rate_hz != 0.0 || sidecar.channel_count != 0 || sidecar.encoding != Encoding::unsaid) {
            throw Refusal(sidecar_name, "rate_hz, channel_count or encoding", "channels only: EDF+ files say the rest");
        }
        auto signals = signals_of(file_.header());
        take_channels(signals, sidecar, sidecar_name);
        signals_ = fitting(std::move(signals), recording.string());
        info_.format = format_name(file_.header().filetype);
        info_.rate = Hertz{signals_.front().rate_hz};
        info_.frames = signals_.front().samples;
        for (auto& signal : signals_) {
            signal.microvolts_per_physical *= sidecar.microvolts_per_count == 0.0 ? 1.0 : sidecar.microvolts_per_count;
            info_.channels.push_back(signal.channel);
        }
    }

    [[nodiscard]] const RecordingInfo& info() const noexcept override { return info_; }

    std::size_t read(std::span<float> frames) override {
        const std::size_t channels = signals_.size();
        const auto wanted = std::min<std::uint64_t>(frames.size() / channels, info_.frames - place_);
        std::array<double, 4096> buffer;
        for (std::size_t done = 0; done < wanted;) {
            const auto chunk = std::min<std::size_t>(buffer.size(), wanted - done);
            for (std::size_t c = 0; c < channels; ++c) {
                read_signal(signals_[c], std::span(buffer).first(chunk));
                for (std::size_t i = 0; i < chunk; ++i) {
                    frames[(done + i) * channels + c] =
                        static_cast<float>(buffer[i] * signals_[c].microvolts_per_physical);
                }
            }
            done += chunk;
            place_ += chunk;
        }
        return wanted;
    }

  private:
    void read_signal(const Signal& signal, std::span<double> out) {
        if (!file_.read(signal.number, place_, out)) {
            throw Refusal(recording_.string(), fmt::format("no samples at frame {}", place_),
                          fmt::format("the {} frames that its header says", info_.frames));
        }
    }

    std::filesystem::path recording_;
    EdfFile file_;
    std::vector<Signal> signals_;
    RecordingInfo info_;
    std::uint64_t place_ = 0;
};

} // namespace

bool looks_like_edf(const std::filesystem::path& recording) {
    std::array<char, 8> head{};
    std::ifstream(recording, std::ios::binary).read(head.data(), head.size());
    const std::string_view start(head.data(), head.size());
    return start == "0       " || start == "\xFF"
                                           "BIOSEMI";
}

std::unique_ptr<RecordingReader> open_edf(const std::filesystem::path& recording, const Sidecar& sidecar,
                                          const std::string& sidecar_name) {
    return std::make_unique<EdfReader>(recording, sidecar, sidecar_name);
}

std::vector<TableEvent> read_edf_annotations(const std::filesystem::path& recording) {
    if (!std::filesystem::is_regular_file(recording) || !looks_like_edf(recording)) {
        throw Refusal(recording.string(), "no EDF+ file", "an EDF+ recording");
    }
    EdfFile file(recording);
    const auto signals = signals_of(file.header());
    std::vector<TableEvent> events;
    for (const auto& annotation : file.annotations()) {
        TableEvent event;
        event.onset_s = static_cast<double>(annotation.onset) / EDFLIB_TIME_DIMENSION;
        event.duration_s = std::max(0.0, static_cast<double>(annotation.duration_l) / EDFLIB_TIME_DIMENSION);
        event.trial_type = annotation.annotation;
        event.sample = signals.empty() ? 0 : std::llround(event.onset_s * signals.front().rate_hz);
        events.push_back(std::move(event));
    }
    return events;
}

} // namespace millpond
