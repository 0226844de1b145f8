#include "app/agreement_run.hpp"

#include "referee/referee_rules.hpp"

namespace millpond {

AgreementRun::AgreementRun(const RefereeSettings& referee, const std::string& name, const Channels& channels,
                           Hertz rate)
    : rate_(rate) {
    bool known = false;
    for (const auto& rule : referee_rules) {
        auto settings = settings_of(rule.value);
        settings.artefacts = referee.artefacts;
        known = known || settings == referee;
        rules_.push_back({std::string(rule.word), Referee::make(settings, channels, rate, std::string(rule.word))});
    }
    if (!known) {
        rules_.push_back({name, Referee::make(referee, channels, rate, name)});
    }
}

void AgreementRun::add(const FrameBlock& block) {
    for (auto& rule : rules_) {
        rule.referee.add(block);
    }
}

Agreement AgreementRun::finish(std::optional<RippleList> labels) {
    std::vector<RippleList> lists;
    if (labels) {
        lists.push_back(std::move(*labels));
    }
    Intervals excluded;
    for (auto& rule : rules_) {
        auto findings = rule.referee.finish();
        excluded = union_of(excluded, findings.artefacts.excluded);
        lists.push_back({rule.name, std::move(findings.ripples), false});
    }
    return agreement_of(std::move(lists), excluded, rate_);
}

} // namespace millpond
