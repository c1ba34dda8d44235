// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/basis_error.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "model/component_maps.h"

namespace foreglow {
namespace {

constexpr double evaluations = 1e6;  // band sums in all

/// Removes the best-fitting monopole and dipole; [n] each.
class DipoleFit {
  public:
    explicit DipoleFit(std::vector<std::array<double, 4>> functions)
        : functions_(std::move(functions)), normal_(4, 4) {
        for (const auto& f : functions_)
            for (std::size_t i = 0; i < 4; ++i)
                for (std::size_t j = 0; j < 4; ++j)
                    normal_(i, j) += f[i] * f[j];
    }
    [[nodiscard]] double rms_without(const std::vector<double>& values) const {
        std::vector<double> right(4, 0.0);
        for (std::size_t p = 0; p < values.size(); ++p)
            for (std::size_t i = 0; i < 4; ++i)
                right[i] += functions_[p][i] * values[p];
        const auto fit = solve_least_squares(normal_, right);
        double sum = 0;
        for (std::size_t p = 0; p < values.size(); ++p) {
            double rest = values[p];
            for (std::size_t i = 0; i < 4; ++i)
                rest -= fit[i] * functions_[p][i];
            sum += rest * rest;
        }
        return std::sqrt(sum / static_cast<double>(std::max<std::size_t>(values.size(), 1)));
    }

  private:
    std::vector<std::array<double, 4>> functions_;
    Matrix normal_;
};

// The pixels of a sample that are defined: their law's numbers, what multiplies them, where they are.
struct Sampled {
    LawPoints points;
    std::vector<double> first, second;  // I and nothing, or Q and U
    std::vector<std::array<double, 4>> functions;
};

// error[p] and truth[p] of one channel for unit amplitude.
struct Compared {
    std::vector<double> error, truth;
};

Compared compare(const SkyLaw& law, const LawPoints& points, const Matrix& components, const Matrix& weights,
                 std::size_t channel, const BandSum& band) {
    const Matrix exact = exact_band_values(law, {band}, points.columns());
    Compared out;
    out.error.reserve(exact.rows);
    out.truth.reserve(exact.rows);
    for (std::size_t p = 0; p < exact.rows; ++p) {
        double sum = 0;
        for (std::size_t k = 0; k < components.columns; ++k)
            sum += weights(channel, k) * components(p, k);
        out.error.push_back(sum - exact(p, 0));
        out.truth.push_back(exact(p, 0));
    }
    return out;
}

double ratio(double error, double truth) {
    return truth > 0 ? error / truth : 0.0;
}

double rms_of_both(const std::vector<double>& a, const std::vector<double>& b,
                   const std::vector<double>& factor) {
    double sum = 0;
    for (std::size_t i = 0; i < a.size(); ++i)
        sum += (a[i] * a[i] + b[i] * b[i]) * factor[i] * factor[i];
    return std::sqrt(sum);
}

// What the fast form of a law leaves where it is a fit itself: under maps of field or energies that range
// far.
double law_error(const SkyLaw& law, const SpectralBasis& basis) {
    double worst = 0;
    if (std::holds_alternative<ElectronSkyLaw>(law))
        for (const BandSum& component : basis.components)
            worst = std::max(worst, BandFactor(law, component, component_tolerance).worst_error());
    return worst;
}

}  // namespace

BasisErrors measure_basis_errors(const SkyModel& sky, const std::vector<Channel>& channels,
                                 const SpectralBasis& intensity, const SpectralBasis* polarized) {
    BasisErrors errors;
    if (sky.nodes) {
        std::vector<BandSum> bands;
        bands.reserve(channels.size());
        for (const Channel& channel : channels)
            bands.push_back(channel.band);
        errors.relative = measure_node_errors(*sky.nodes, bands, polarized != nullptr).rms;
        return errors;
    }
    double of_law = sky.electrons ? law_error(intensity_law(sky), intensity) : 0;
    if (sky.electrons && polarized != nullptr)
        of_law = std::max(of_law, law_error(polarized_law(sky), *polarized));
    errors.relative.assign(channels.size(), of_law);
    if (intensity.is_exact && (polarized == nullptr || polarized->is_exact)) return errors;
    const auto pixels = std::clamp<std::int64_t>(
        static_cast<std::int64_t>(evaluations / static_cast<double>(channels.size())), 2048, 65536);
    const SkySample sample = make_sky_sample(sky, pixels, polarized != nullptr);
    const SkyStrip& values = sample.values;
    const LawColumns columns = values.intensity_columns();
    Sampled of_intensity;
    Sampled of_polarization;
    for (std::size_t p = 0; p < values.intensity.size(); ++p) {
        if (is_defined(values.intensity[p]) && columns.is_defined_at(p)) {
            of_intensity.points.add(columns, p);
            of_intensity.first.push_back(values.intensity[p]);
            const Vector3& n = sample.directions[p];
            of_intensity.functions.push_back({1.0, n[0], n[1], n[2]});
        }
        if (polarized == nullptr) continue;
        const LawColumns own = values.polarized_columns();
        if (!is_defined(values.q[p] + values.u[p]) || !own.is_defined_at(p)) continue;
        of_polarization.points.add(own, p);
        of_polarization.first.push_back(values.q[p]);
        of_polarization.second.push_back(values.u[p]);
    }
    const DipoleFit fit(std::move(of_intensity.functions));
    const SkyLaw law = intensity_law(sky);
    const Matrix components = exact_band_values(law, intensity.components, of_intensity.points.columns());
    for (std::size_t c = 0; c < channels.size(); ++c) {
        Compared i = compare(law, of_intensity.points, components, intensity.weights, c, channels[c].band);
        for (std::size_t p = 0; p < of_intensity.first.size(); ++p) {
            i.error[p] *= of_intensity.first[p];
            i.truth[p] *= of_intensity.first[p];
        }
        errors.relative[c] =
            std::max(errors.relative[c], ratio(fit.rms_without(i.error), fit.rms_without(i.truth)));
    }
    if (polarized == nullptr) return errors;
    const SkyLaw own_law = polarized_law(sky);
    const Matrix own_components =
        exact_band_values(own_law, polarized->components, of_polarization.points.columns());
    for (std::size_t c = 0; c < channels.size(); ++c) {
        const Compared p =
            compare(own_law, of_polarization.points, own_components, polarized->weights, c, channels[c].band);
        const auto rms = [&](const std::vector<double>& factor) {
            return rms_of_both(of_polarization.first, of_polarization.second, factor);
        };
        errors.relative[c] = std::max(errors.relative[c], ratio(rms(p.error), rms(p.truth)));
    }
    return errors;
}

}  // namespace foreglow
