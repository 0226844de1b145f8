// `millpond assign`: which session, block or trial has which condition, drawn before the experiment.
#include "app/commands.hpp"
#include "assignment/assignment.hpp"
#include "base/refusal.hpp"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <map>
#include <memory>
#include <random>

namespace millpond {
namespace {

struct MakeOptions {
    std::vector<std::string> words;
    std::vector<std::uint32_t> shares;
    AssignmentPlan plan;
    std::filesystem::path out;
};

std::vector<ConditionShare> shares_of(const MakeOptions& options) {
    if (!options.shares.empty() && options.shares.size() != options.words.size()) {
        throw Refusal("--shares",
                      fmt::format("{} numbers for {} conditions", options.shares.size(), options.words.size()),
                      "one for each condition");
    }
    std::vector<ConditionShare> shares;
    for (std::size_t i = 0; i < options.words.size(); ++i) {
        const auto* known = std::find_if(std::begin(conditions), std::end(conditions),
                                         [&](const auto& choice) { return choice.word == options.words[i]; });
        if (known == std::end(conditions)) {
            throw Refusal("--conditions", "'" + options.words[i] + "'",
                          "disrupt, delayed, yoked, rate_matched and none, with commas between");
        }
        shares.push_back({known->value, options.shares.empty() ? 1 : options.shares[i]});
    }
    return shares;
}

std::uint64_t secret_number() {
    std::random_device device; // the kernel's random numbers
    return (std::uint64_t{device()} << 32) | device();
}

std::map<Condition, std::size_t> counts(const std::vector<Condition>& list, std::size_t upto) {
    std::map<Condition, std::size_t> counted;
    for (std::size_t i = 0; i < std::min(upto, list.size()); ++i) {
        ++counted[list[i]];
    }
    return counted;
}

// The order in which conditions come: that of the sessions, or of the units of one session.
std::vector<std::vector<Condition>> runs_of(const Assignment& assignment) {
    std::vector<std::vector<Condition>> runs;
    if (assignment.unit == AssignmentUnit::session) {
        runs.emplace_back();
        for (const auto& session : assignment.sessions) {
            runs.front().push_back(session.conditions.front());
        }
    } else {
        for (const auto& session : assignment.sessions) {
            runs.push_back(session.conditions);
        }
    }
    return runs;
}

// How far any condition's count was from its share of the run at any moment.
double largest_imbalance(const std::vector<Condition>& run) {
    double largest = 0.0;
    const auto whole = counts(run, run.size());
    for (std::size_t upto = 1; upto <= run.size(); ++upto) {
        auto counted = counts(run, upto);
        for (const auto& [condition, total] : whole) {
            const double share = static_cast<double>(total) / static_cast<double>(run.size());
            largest = std::max(largest,
                               std::abs(static_cast<double>(counted[condition]) - share * static_cast<double>(upto)));
        }
    }
    return largest;
}

void print_balance(const Assignment& assignment) {
    const auto unit = word_for<AssignmentUnit>(assignment_units, assignment.unit);
    const auto runs = runs_of(assignment);
    std::map<Condition, std::size_t> total;
    std::size_t units = 0;
    double apart = 0.0;
    for (const auto& run : runs) {
        for (const auto condition : run) {
            ++total[condition];
        }
        units += run.size();
        apart = std::max(apart, largest_imbalance(run));
    }
    fmt::print("{:<14} {:>6}  share\n", "condition", std::string(unit) + "s");
    for (const auto& [condition, count] : total) {
        fmt::print("{:<14} {:>6}  {:.1f} %\n", word_for<Condition>(conditions, condition), count,
                   100.0 * static_cast<double>(count) / static_cast<double>(units));
    }
    fmt::print("balance        no condition was ever more than {:.1f} from its share\n", apart);
}

void print_codes(const Assignment& assignment) {
    fmt::print("codes         ");
    for (const auto& session : assignment.sessions) {
        fmt::print(" {}", session.code);
    }
    fmt::print("\n");
}

void run_make(MakeOptions& options) {
    auto& plan = options.plan;
    plan.shares = shares_of(options);
    if (plan.unit == AssignmentUnit::session && plan.units != 1) {
        throw Refusal("--units", fmt::format("{}", plan.units), "1: the unit is the session");
    }
    if ((plan.unit == AssignmentUnit::block) != (plan.block_minutes > 0.0)) {
        throw Refusal("--block-minutes", fmt::format("{}", plan.block_minutes),
                      "more than 0 where --unit is block, else nothing");
    }
    const auto assignment = make_assignment(plan, plan.sealed ? secret_number() : 0);
    write_assignment(options.out, assignment);
    print_balance(assignment);
    print_codes(assignment);
    fmt::print("list           {}{}\n", options.out.string(),
               plan.sealed ? ", sealed: give it to somebody who does not run the sessions" : "");
}

void add_make(CLI::App& assign) {
    auto options = std::make_shared<MakeOptions>();
    auto& command = *assign.add_subcommand("make", "draw a list by permuted blocks and write it");
    command.add_option("--conditions", options->words, "conditions to draw, with commas between")
        ->delimiter(',')
        ->required();
    command.add_option("--shares", options->shares, "how often each stands in a permuted block; nothing: once each")
        ->delimiter(',');
    std::map<std::string, AssignmentUnit> units;
    for (const auto& choice : assignment_units) {
        units.emplace(choice.word, choice.value);
    }
    command.add_option("--unit", options->plan.unit, "what one condition lasts for")
        ->transform(CLI::CheckedTransformer(units).description("{session,block,trial}"))
        ->default_str("session");
    command.add_option("--sessions", options->plan.sessions, "sessions of the list")
        ->check(CLI::Range(1U, 10000U))
        ->required();
    command.add_option("--units", options->plan.units, "blocks or trials in each session")
        ->check(CLI::Range(1U, 100000U))
        ->capture_default_str();
    command.add_option("--block-minutes", options->plan.block_minutes, "length of a block")
        ->check(CLI::Range(0.01, 1e5));
    auto* seed = command.add_option("--seed", options->plan.seed, "of the draws: the same seed, the same list")
                     ->capture_default_str();
    command
        .add_flag("--sealed", options->plan.sealed,
                  "mask the conditions: sessions are known by their codes alone until `unblind`.\n"
                  "Drawn from the computer's own random numbers, which nobody can repeat")
        ->excludes(seed);
    command.add_option("--out", options->out, "list to write; one that exists is never written over")->required();
    add_example(command, "build/millpond assign make --conditions disrupt,delayed --sessions 24 --sealed "
                         "--out build/rats.assignment.yaml");
    command.callback([options] { run_make(*options); });
}

void add_show(CLI::App& assign) {
    auto file = std::make_shared<std::filesystem::path>();
    auto& command =
        *assign.add_subcommand("show", "codes and balance of a list; its order only where it is not sealed");
    command.add_option("LIST", *file, "list that `assign make` wrote")->required();
    add_example(command, "build/millpond assign show build/rats.assignment.yaml");
    command.callback([file] {
        const auto assignment = read_assignment(*file);
        print_balance(assignment);
        print_codes(assignment);
        if (assignment.sealed) {
            return;
        }
        for (const auto& session : assignment.sessions) {
            fmt::print("{:<14}", session.code);
            for (const auto condition : session.conditions) {
                fmt::print(" {}", word_for<Condition>(conditions, condition));
            }
            fmt::print("\n");
        }
    });
}

} // namespace

void add_assign_command(CLI::App& program) {
    auto& assign = *program.add_subcommand("assign", "draw which session, block or trial has which condition");
    assign.require_subcommand(1);
    add_example(assign, "build/millpond assign make --conditions disrupt,delayed --sessions 24 --sealed "
                        "--out build/rats.assignment.yaml");
    add_make(assign);
    add_show(assign);
}

} // namespace millpond
