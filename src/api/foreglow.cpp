// SPDX-License-Identifier: GPL-2.0-or-later
#include "api/foreglow.h"

#include <cmath>

#include "base/build_info.h"
#include "base/parallel.h"
#include "base/progress.h"
#include "jobs/make.h"
#include "jobs/study_request.h"
#include "physics/spectral_law.h"

namespace foreglow::api {
namespace {

PlanRequest request_of(const std::filesystem::path& study, const RunOptions& options) {
    if (options.threads && *options.threads < 1)
        throw InputError("RunOptions::threads is " + std::to_string(*options.threads) +
                         ": give 1 or more, or leave it empty for all processors");
    set_thread_count(options.threads.value_or(available_processors()));
    StudyRequest request;
    request.study = study;
    request.options.overrides = options.overrides;
    request.out = options.out;
    request.replace = options.replace;
    return make_plan_request(request);
}

}  // namespace

RunResult make_maps(const std::filesystem::path& study, const RunOptions& options) {
    Progress progress(Progress::Style::Quiet);
    const MakeSummary summary = run_make({request_of(study, options), false}, progress);
    return {summary.out, progress.warnings()};
}

std::string plan_maps(const std::filesystem::path& study, const RunOptions& options) {
    return describe_plan(make_plan(request_of(study, options)));
}

double brightness_ratio(Frequency frequency, Frequency reference, double index, double curvature) {
    return std::exp(log_brightness_ratio({index, curvature}, log_frequency_ratio(frequency, reference)));
}

std::string library_version() {
    return version();
}

}  // namespace foreglow::api
