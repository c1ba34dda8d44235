// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/electron_request.h"

namespace foreglow {
namespace {

constexpr double any_energy_GeV = 10;  // stands where a map says it
constexpr double any_field_uG = 5;

void check_pairs(const ElectronRequest& request, const RefuseKey& refuse) {
    if (request.field_uG && request.has_field_map)
        refuse("field_map", "contradicts 'field': keep one of the two");
    if (!request.field_uG && !request.has_field_map)
        refuse("field", "is missing: say how strong the field is, for example \"5 uG\"");
    if (request.break_GeV && request.has_break_map)
        refuse("break_energy_map", "contradicts 'break_energy': keep one of the two");
    if (request.cutoff_GeV && request.has_cutoff_map)
        refuse("cutoff_energy_map", "contradicts 'cutoff_energy': keep one of the two");
    if (request.break_step && !request.break_GeV && !request.has_break_map)
        refuse("break_step",
               "needs an energy where the slope rises: add break_energy, for example \"10 GeV\"");
    if (request.cutoff && !request.cutoff_GeV && !request.has_cutoff_map)
        refuse("cutoff", "needs an energy where the spectrum ends: add cutoff_energy, for example \"2 TeV\"");
}

Aging make_aging(const ElectronRequest& request, const RefuseKey& refuse) {
    const AgingWord word = request.aging.value_or(AgingWord::None);
    if (word == AgingWord::None && request.age_Myr)
        refuse("age",
               "says how old the electrons are, but no ageing is asked for: add aging = \"continuous\", "
               "\"isotropized\" or \"fixed-pitch\", or take it out");
    if (word != AgingWord::None && !request.age_Myr)
        refuse("age", "is missing: say how long the electrons have aged, for example \"50 Myr\"");
    if (request.edge && word != AgingWord::Isotropized)
        refuse("edge", "says how an isotropized spectrum ends: it goes with aging = \"isotropized\" alone");
    const bool exponential = request.edge == CutoffShape::Exponential;
    if (exponential && (request.cutoff_GeV || request.has_cutoff_map))
        refuse(
            "edge",
            "= \"exponential\" stands for the cut-off, so it contradicts cutoff_energy: keep one of the two");
    switch (word) {
        case AgingWord::Continuous:
            return ContinuousInjection{*request.age_Myr};
        case AgingWord::Isotropized:
            return IsotropizedAging{*request.age_Myr, request.edge.value_or(CutoffShape::Sharp)};
        case AgingWord::FixedPitch:
            return FixedPitchAging{*request.age_Myr};
        case AgingWord::None:
            break;
    }
    return NoAging{};
}

}  // namespace

ElectronLaw make_electron_law(const ElectronRequest& request, const RefuseKey& refuse) {
    check_pairs(request, refuse);
    ElectronLaw law;
    law.field_uG = request.field_uG.value_or(any_field_uG);
    law.geometry = request.geometry.value_or(FieldGeometry::Ordered);
    if (request.break_GeV || request.has_break_map)
        law.energy_break =
            EnergyBreak{request.break_GeV.value_or(any_energy_GeV), request.break_step.value_or(1)};
    if (request.cutoff_GeV || request.has_cutoff_map)
        law.cutoff = EnergyCutoff{request.cutoff_GeV.value_or(any_energy_GeV),
                                  request.cutoff.value_or(CutoffShape::Exponential)};
    law.aging = make_aging(request, refuse);
    law.redshift = request.redshift.value_or(0);
    return law;
}

}  // namespace foreglow
