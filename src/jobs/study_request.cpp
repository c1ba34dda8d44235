// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/study_request.h"

#include "base/error.h"
#include "model/galaxy_cache.h"

namespace foreglow {
namespace {

bool has_own_keys(const StudyOptions& o) {
    return !o.model.empty() || !o.frequencies.empty() || o.title || o.nside || o.stokes || o.unit ||
           o.precision || o.frame || o.ordering || o.polarization_convention || o.monopole || o.coverage ||
           o.bandwidth || o.beam_fwhm || o.lmax || o.seed || o.realizations || o.accuracy || o.truth;
}

}  // namespace

PlanRequest make_plan_request(const StudyRequest& request) {
    PlanRequest plan;
    if (request.study) {
        if (has_own_keys(request.options))
            throw InputError(
                "a study file and options that stand for one contradict each other: change the file's keys "
                "with " +
                std::string("--set key=value, such as --set nside=64"));
        plan.study = read_study(*request.study, request.options.overrides);
    } else {
        if (!has_own_keys(request.options))
            throw InputError("name a study file, or say what to make with --model, --frequency and --nside");
        plan.study = make_study_from_options(request.options);
    }
    plan.out = request.out;
    plan.realization = request.realization;
    plan.replace = request.replace;
    if (request.no_cache && request.cache)
        throw InputError("--cache and --no-cache contradict each other: keep one of the two");
    if (!request.no_cache) plan.cache = request.cache ? request.cache : default_cache_folder();
    return plan;
}

}  // namespace foreglow
