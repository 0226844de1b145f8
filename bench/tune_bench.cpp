// What does a sweep of many settings cost, as a multiple of one dry run of the same recording?
// Usage: tune_bench [MINUTES] [REPEATS]   an invented recording of four sites at 1250 Hz; 60 minutes, 3 repeats.
// Both are the program's own commands from start to end: reading the file, engine, scoring against labels, tables. Wall
// time depends on the machine's cores and its other programs; processor time (user and system) does less.
#include "support/bench.hpp"

#include <fmt/format.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

namespace {

using namespace millpond;

struct Cost {
    double wall_s = 0.0, processor_s = 0.0;
    double most_memory_mb = 0.0;
};

double seconds(const timeval& time) {
    return static_cast<double>(time.tv_sec) + static_cast<double>(time.tv_usec) / 1e6;
}

Cost cost_of(const std::string& arguments) {
    const auto command = fmt::format("exec {} {} >/dev/null 2>&1", MILLPOND_PROGRAM, arguments);
    const auto began = monotonic_now();
    const pid_t child = fork();
    if (child == 0) {
        execl("/bin/sh", "sh", "-c", command.c_str(), static_cast<char*>(nullptr));
        _exit(127);
    }
    int status = 0;
    rusage used{};
    if (child < 0 || wait4(child, &status, 0, &used) != child || status != 0) {
        throw std::runtime_error("failed: " + command);
    }
    return {static_cast<double>((monotonic_now() - began).count()) / 1e9,
            seconds(used.ru_utime) + seconds(used.ru_stime), static_cast<double>(used.ru_maxrss) / 1024.0};
}

// 2 x 2 bands and orders, 5 smoothings, 25 thresholds: 20 filters and envelopes, 500 settings.
void write_grid(const std::string& file) {
    std::ofstream grid(file);
    grid << "detector:\n  filter: {low_hz: [130, 150], order: [1, 2]}\n"
            "  envelope: {smoothing_ms: [2, 4, 6, 8, 10]}\n  threshold: {deviations: [";
    for (int i = 0; i < 25; ++i) {
        grid << (i > 0 ? ", " : "") << fmt::format("{:.2f}", 2.0 + 0.25 * i);
    }
    grid << "]}\n";
}

Cost median_cost(const std::string& arguments, int repeats) {
    std::vector<double> wall, processor, memory;
    for (int i = 0; i < repeats; ++i) {
        const auto cost = cost_of(arguments);
        wall.push_back(cost.wall_s);
        processor.push_back(cost.processor_s);
        memory.push_back(cost.most_memory_mb);
    }
    return {bench::median(wall), bench::median(processor), bench::median(memory)};
}

void compare(const std::string& folder, const std::string& truth, const char* said, int repeats) {
    const auto recording = folder + "/rest.wav";
    const auto dry = median_cost(fmt::format("dryrun {} {} --settings {}/config/dryrun.yaml --out {}/dry --overwrite",
                                             recording, truth, MILLPOND_SOURCE_DIR, folder),
                                 repeats);
    const auto sweep = median_cost(fmt::format("tune {} {} --grid {}/grid.yaml --threads 2 --out {}/tuned.yaml "
                                               "--overwrite",
                                               recording, truth, folder, folder),
                                   repeats);
    fmt::print("truth: {}\n", said);
    fmt::print("  dry run  {:6.2f} s wall, {:6.2f} s of processor, {:6.1f} MB at most\n", dry.wall_s, dry.processor_s,
               dry.most_memory_mb);
    fmt::print("  sweep    {:6.2f} s wall, {:6.2f} s of processor, {:6.1f} MB at most\n", sweep.wall_s,
               sweep.processor_s, sweep.most_memory_mb);
    fmt::print("  ratio    {:6.1f} wall, {:6.1f} processor\n", sweep.wall_s / dry.wall_s,
               sweep.processor_s / dry.processor_s);
}

} // namespace

int main(int argc, char** argv) {
    const double minutes = argc > 1 ? std::atof(argv[1]) : 60.0;
    const int repeats = argc > 2 ? std::atoi(argv[2]) : 3;
    char pattern[] = "/tmp/millpond-tune-bench-XXXXXX";
    const std::string folder = mkdtemp(pattern);
    cost_of(fmt::format("synth {}/rest.wav --duration-s {} --seed 77", folder, minutes * 60.0));
    write_grid(folder + "/grid.yaml");
    fmt::print("500 settings on 2 threads against one dry run; 4 sites at 1250 Hz, {} minutes, medians of {}\n",
               minutes, repeats);
    compare(folder, "", "the referee, found anew by each", repeats);
    compare(folder, fmt::format("--labels {}/rest.wav.truth.tsv", folder), "labels", repeats);
    std::filesystem::remove_all(folder);
}
