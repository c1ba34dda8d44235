// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_intensity.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/normal_kernel.h"
#include "base/parallel.h"
#include "math/vector_exp.h"
#include "model/detailed_sky.h"
#include "model/lognormal_spectrum.h"
#include "model/sky_region.h"
#include "sphere/angular_correlation.h"
#include "sphere/harmonics.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 16384;
constexpr double largest_steepness = 1;

FOREGLOW_WIDE
void add_products(const double* base, const float* weights, double* drawn, std::size_t count) {
    for (std::size_t i = 0; i < count; ++i)
        drawn[i] = base[i] + static_cast<double>(weights[i]) * drawn[i];
}

FOREGLOW_WIDE
void multiply_lognormal(const double* base, const float* weights, double half_variance, double* drawn,
                        std::size_t count) {
    for (std::size_t i = 0; i < count; ++i) {
        const double factor = vector_exp(drawn[i] - half_variance);
        const double added = base[i] + static_cast<double>(weights[i]) * drawn[i];
        drawn[i] = base[i] > 0 ? base[i] * factor : added;
    }
}

FOREGLOW_WIDE
void multiply_steep(const double* base, const float* weights, const float* steepness, double* drawn,
                    std::size_t count) {
    for (std::size_t i = 0; i < count; ++i) {
        const double s = static_cast<double>(steepness[i]);
        const double factor = vector_exp(s * drawn[i] - 0.5 * s * s);
        const double added = base[i] + static_cast<double>(weights[i]) * drawn[i];
        drawn[i] = base[i] > 0 ? base[i] * factor : added;
    }
}

}  // namespace

DetailIntensity::DetailIntensity(const DetailSpec& spec, std::shared_ptr<const SkyMap> map,
                                 const DetailReport& report, Modulation modulation,
                                 std::span<const double> region)
    : template_(std::move(map)),
      lmax_(report.lmax),
      lognormal_(spec.form == DetailForm::Lognormal),
      drawn_cl_(report.added.tt),
      weights_(std::move(modulation.weights)),
      floored_(modulation.floored) {
    rms_added_ = std::sqrt(variance_of_spectrum(drawn_cl_));
    const double mean_square =
        region_mean(region, [&](std::size_t i) { return template_->values[i] * template_->values[i]; });
    relative_rms_ = mean_square > 0 ? rms_added_ / std::sqrt(mean_square) : 0.0;
    if (lognormal_ && rms_added_ > 0) {
        FOREGLOW_EXPECTS(mean_square > 0);
        if (spec.modulation == 1)
            prepare_lognormal(mean_square);
        else
            prepare_steepness(region);
    }
}

// G has the spectrum whose exponential has the relative target; w sqrt(<I_T^2>) G stands in where it cannot
// multiply.
void DetailIntensity::prepare_lognormal(double mean_square) {
    scale_ = 1 / mean_square;
    for (double& cl : drawn_cl_)
        cl *= scale_;
    LognormalSpectrum g = make_lognormal_spectrum(drawn_cl_);
    drawn_cl_ = std::move(g.cl);
    half_variance_ = 0.5 * g.variance;
    clipped_ = g.clipped;
    const auto kelvin = static_cast<float>(std::sqrt(mean_square));
    for (float& w : weights_)
        w *= kelvin;
}

void DetailIntensity::prepare_steepness(std::span<const double> region) {
    const auto& values = template_->values;
    const auto relative = [&](std::size_t i) {
        const double ratio = values[i] > 0 ? static_cast<double>(weights_[i]) * rms_added_ / values[i] : 0.0;
        return ratio * ratio;
    };
    steepness_.resize(values.size());
    for (std::size_t i = 0; i < values.size(); ++i) {
        const double s = std::sqrt(kernel::natural_log(1 + relative(i)));
        if (is_defined(s)) steepest_ = std::max(steepest_, s);
        steepness_[i] = static_cast<float>(std::min(s, largest_steepness));
    }
    // The shape of the correlation changes with the steepness; it is inverted for that of the region.
    const double typical = region_mean(region, relative);
    scale_ = typical / (rms_added_ * rms_added_);
    for (double& cl : drawn_cl_)
        cl *= scale_;
    LognormalSpectrum g = make_lognormal_spectrum(drawn_cl_);
    clipped_ = g.clipped;
    drawn_cl_ = std::move(g.cl);
    norm_ = 1 / g.variance;
    for (double& cl : drawn_cl_)
        cl *= norm_;
    const auto kelvin = static_cast<float>(rms_added_);
    for (float& w : weights_)
        w *= kelvin;
}

std::shared_ptr<const SkyMap> DetailIntensity::realize(const DrawKey& key, std::int64_t& not_positive) const {
    auto out = std::make_shared<SkyMap>();
    out->grid = template_->grid;
    out->frame = template_->frame;
    out->unit = template_->unit;
    out->values = synthesize(draw_intensity(drawn_cl_, lmax_, key), template_->grid);
    const double* base = template_->values.data();
    parallel_for_blocks(template_->grid.npix(), block, [&](std::int64_t begin, std::int64_t end) {
        const auto n = static_cast<std::size_t>(end - begin);
        double* drawn = out->values.data() + begin;
        if (!lognormal_)
            add_products(base + begin, weights_.data() + begin, drawn, n);
        else if (steepness_.empty())
            multiply_lognormal(base + begin, weights_.data() + begin, half_variance_, drawn, n);
        else
            multiply_steep(base + begin, weights_.data() + begin, steepness_.data() + begin, drawn, n);
    });
    not_positive = 0;
    if (lognormal_)
        not_positive = std::count_if(template_->values.begin(), template_->values.end(),
                                     [](double v) { return v <= 0; });
    return out;
}

void DetailIntensity::describe(DetailReport& report) const {
    report.rms_added = rms_added_;
    report.relative_rms = relative_rms_;
    report.floored = floored_;
    report.clipped = clipped_;
    report.steepest = steepest_;
}

}  // namespace foreglow
