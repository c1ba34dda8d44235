// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sky_model.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 16384;

PixelField::Range require_range(const PixelField& field, const char* name) {
    const auto range = field.range();
    if (!range) throw DataError(std::string("the ") + name + " map has no defined pixel: give another map");
    return *range;
}

void evaluate_stokes(const SkyModel& sky, const StokesField& field, const RingStrip& strip,
                     std::span<double> q, std::span<double> u) {
    if (const auto* maps = std::get_if<std::shared_ptr<const StokesMaps>>(&field.source)) {
        FOREGLOW_EXPECTS((*maps)->grid == sky.grid);
        for (const PixelRange& range : pixel_ranges(sky.grid, strip)) {
            copy_range((*maps)->q, range, q);
            copy_range((*maps)->u, range, u);
        }
        return;
    }
    synthesize_strip_spin2(std::get<AlmEB>(field.source), sky.grid, strip, q, u);
    if (!field.filled) return;
    undefine_filled(*field.filled, sky.grid, sky.frame, strip, q);
    undefine_filled(*field.filled, sky.grid, sky.frame, strip, u);
}

// Q and U whose length is a fraction of the intensity at the polarization's reference frequency.
void scale_to_fraction(const SkyModel& sky, const RingStrip& strip, SkyStrip& values) {
    const PolarizedSky& polarized = *sky.polarization;
    std::vector<double> fraction(values.q.size());
    polarized.fraction->evaluate(sky.grid, strip, fraction);
    const std::vector<double> there = make_brightness_ratios(sky, values, polarized.reference);
    for (std::size_t i = 0; i < fraction.size(); ++i) {
        const double length = std::hypot(values.q[i], values.u[i]);
        const double factor = fraction[i] * values.intensity[i] * there[i] / length;
        values.q[i] *= factor;
        values.u[i] *= factor;
    }
}

void add_polarized_law(const SkyModel& sky, const RingStrip& strip, SkyStrip& values) {
    const PolarizedSky& polarized = *sky.polarization;
    if (sky.electrons && !polarized.index) return;  // the same electrons
    const std::size_t n = values.q.size();
    values.polarized_index.resize(n);
    values.polarized_curvature.assign(n, 0.0);
    if (polarized.index) {
        polarized.index->evaluate(sky.grid, strip, values.polarized_index);
        return;
    }
    const double log_ratio = log_frequency_ratio(polarized.reference, sky.reference);
    for (std::size_t i = 0; i < n; ++i) {
        values.polarized_index[i] = local_index({values.index[i], values.curvature[i]}, log_ratio);
        values.polarized_curvature[i] = values.curvature[i];
    }
}

void add_electrons(const SkyModel& sky, const RingStrip& strip, SkyStrip& values) {
    const ElectronSky& electrons = *sky.electrons;
    values.slope.resize(values.intensity.size());
    electrons.slope.evaluate(sky.grid, strip, values.slope);
    for (const auto& [map, column] : {std::pair(&electrons.field, &values.field),
                                      {&electrons.break_energy, &values.break_energy},
                                      {&electrons.cutoff_energy, &values.cutoff_energy}}) {
        if (!*map) continue;
        column->resize(values.slope.size());
        (*map)->evaluate(sky.grid, strip, *column);
    }
}

SkyLaw electron_law(const SkyModel& sky, Frequency reference, EmissionPart part) {
    return ElectronSkyLaw{reference, sky.electrons->law, sky.electrons->shape->range(), part};
}

// Bounds of beta + f c over beta and c in their own bounds.
ParameterRange shifted(const PixelField::Range& index, const PixelField::Range& curvature, double factor) {
    const double a = factor * curvature.low;
    const double b = factor * curvature.high;
    return {index.low + std::min(a, b), index.high + std::max(a, b), curvature.low, curvature.high};
}

}  // namespace

namespace {

std::vector<std::vector<double>> copy_strip(const SkyModel& sky, const RingStrip& strip,
                                            const std::vector<std::vector<double>>& maps) {
    std::vector<std::vector<double>> out;
    out.reserve(maps.size());
    for (const auto& map : maps) {
        out.emplace_back(static_cast<std::size_t>(pixel_count(sky.grid, strip)));
        for (const PixelRange& range : pixel_ranges(sky.grid, strip))
            copy_range(map, range, out.back());
    }
    return out;
}

}  // namespace

SkyStrip make_node_strip(const SkyModel& sky, const RingStrip& strip, bool with_polarization) {
    FOREGLOW_EXPECTS(sky.nodes != nullptr);
    const NodeSky& nodes = *sky.nodes;
    SkyStrip values = make_sky_strip(sky, strip, with_polarization);
    values.node_i = copy_strip(sky, strip, nodes.i);
    if (!with_polarization) return values;
    values.node_q = copy_strip(sky, strip, nodes.q.empty() ? nodes.band_q : nodes.q);
    values.node_u = copy_strip(sky, strip, nodes.u.empty() ? nodes.band_u : nodes.u);
    return values;
}

SkyStrip make_sky_strip(const SkyModel& sky, const RingStrip& strip, bool with_polarization) {
    const auto n = static_cast<std::size_t>(pixel_count(sky.grid, strip));
    SkyStrip values;
    values.intensity.resize(n);
    sky.intensity.evaluate(sky.grid, strip, values.intensity);
    if (sky.electrons) {
        add_electrons(sky, strip, values);
    } else {
        values.index.resize(n);
        values.curvature.resize(n);
        sky.index.evaluate(sky.grid, strip, values.index);
        sky.curvature.evaluate(sky.grid, strip, values.curvature);
    }
    if (sky.index_log_ratio != 0 && !sky.electrons)
        parallel_for_blocks(static_cast<std::int64_t>(n), block, [&](std::int64_t begin, std::int64_t end) {
            for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i)
                values.index[i] =
                    index_at_reference(values.index[i], values.curvature[i], sky.index_log_ratio);
        });
    if (!with_polarization) return values;
    FOREGLOW_EXPECTS(sky.polarization.has_value());
    values.q.resize(n);
    values.u.resize(n);
    evaluate_stokes(sky, sky.polarization->stokes, strip, values.q, values.u);
    if (sky.polarization->fraction) scale_to_fraction(sky, strip, values);
    if (!polarization_shares_law(sky)) add_polarized_law(sky, strip, values);
    return values;
}

ParameterRange parameter_range(const SkyModel& sky) {
    return shifted(require_range(sky.index, "index"), require_range(sky.curvature, "curvature"),
                   -2 * sky.index_log_ratio);
}

ParameterRange polarized_parameter_range(const SkyModel& sky) {
    FOREGLOW_EXPECTS(sky.polarization.has_value());
    if (sky.polarization->index) {
        const auto own = require_range(*sky.polarization->index, "polarization index");
        return {own.low, own.high, 0, 0};
    }
    const double log_ratio = log_frequency_ratio(sky.polarization->reference, sky.reference);
    return shifted(require_range(sky.index, "index"), require_range(sky.curvature, "curvature"),
                   2 * (log_ratio - sky.index_log_ratio));
}

void add_local_spectrum(const SkyModel& sky, SkyStrip& strip) {
    if (!sky.electrons) return;
    strip.index.resize(strip.slope.size());
    strip.curvature.resize(strip.slope.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(strip.slope.size()), block, [&](std::int64_t begin, std::int64_t end) {
            const auto from = static_cast<std::size_t>(begin);
            const auto n = static_cast<std::size_t>(end - begin);
            sky.electrons->shape->write_local(strip.intensity_columns().part(from, n).electrons,
                                              std::span(strip.index).subspan(from, n),
                                              std::span(strip.curvature).subspan(from, n));
        });
}

std::vector<double> make_brightness_ratios(const SkyModel& sky, const SkyStrip& strip, Frequency frequency) {
    std::vector<double> ratios(strip.intensity.size());
    if (sky.electrons) {
        BandFactor(intensity_law(sky), {{frequency.hz()}, {1.0}}, 1e-10)
            .evaluate(strip.intensity_columns(), ratios);
        return ratios;
    }
    const double log_ratio = log_frequency_ratio(frequency, sky.reference);
    for (std::size_t i = 0; i < ratios.size(); ++i)
        ratios[i] = std::exp(log_brightness_ratio({strip.index[i], strip.curvature[i]}, log_ratio));
    return ratios;
}

SkyLaw intensity_law(const SkyModel& sky) {
    if (sky.electrons) return electron_law(sky, sky.reference, EmissionPart::Total);
    return CurvedSkyLaw{sky.reference, parameter_range(sky)};
}

SkyLaw polarized_law(const SkyModel& sky) {
    if (sky.electrons && !sky.polarization->index)
        return electron_law(sky, sky.polarization->reference, EmissionPart::Polarized);
    return CurvedSkyLaw{sky.polarization->reference, polarized_parameter_range(sky)};
}

bool polarization_shares_law(const SkyModel& sky) {
    return sky.polarization && !sky.electrons && !sky.polarization->index &&
           sky.polarization->reference == sky.reference;
}

}  // namespace foreglow
