// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/basis_error.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/parallel.h"
#include "model/component_maps.h"

namespace foreglow {
namespace {

constexpr double evaluations = 4e6;  // band sums in all

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

struct Spectra {
    std::vector<double> index, curvature;  ///< [n], defined pixels only
};

// Component values for unit amplitude, [pixels][K].
Matrix component_values(const Spectra& spectra, const SpectralBasis& basis, Frequency reference) {
    Matrix values(spectra.index.size(), basis.components.size());
    parallel_for_blocks(
        static_cast<std::int64_t>(values.rows), 1024, [&](std::int64_t begin, std::int64_t end) {
            for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p)
                for (std::size_t k = 0; k < values.columns; ++k)
                    values(p, k) = exact_band_value(basis.components[k], reference, spectra.index[p],
                                                    spectra.curvature[p]);
        });
    return values;
}

// error[p] and truth[p] of one channel for unit amplitude.
struct Compared {
    std::vector<double> error, truth;
};

Compared compare(const Spectra& spectra, const Matrix& components, const Matrix& weights, std::size_t channel,
                 const BandSum& band, Frequency reference) {
    Compared out;
    for (std::size_t p = 0; p < spectra.index.size(); ++p) {
        double sum = 0;
        for (std::size_t k = 0; k < components.columns; ++k)
            sum += weights(channel, k) * components(p, k);
        const double exact = exact_band_value(band, reference, spectra.index[p], spectra.curvature[p]);
        out.error.push_back(sum - exact);
        out.truth.push_back(exact);
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

}  // namespace

BasisErrors measure_basis_errors(const SkyModel& sky, const std::vector<Channel>& channels,
                                 const SpectralBasis& intensity, const SpectralBasis* polarized) {
    BasisErrors errors;
    errors.relative.assign(channels.size(), 0.0);
    if (intensity.is_exact && (polarized == nullptr || polarized->is_exact)) return errors;
    const auto pixels = std::clamp<std::int64_t>(
        static_cast<std::int64_t>(evaluations / static_cast<double>(channels.size())), 2048, 65536);
    const SkySample sample = make_sky_sample(sky, pixels, polarized != nullptr);
    const SkyStrip& values = sample.values;
    Spectra spectra, polarized_spectra;
    std::vector<double> amplitude, q, u;
    std::vector<std::array<double, 4>> functions;
    for (std::size_t p = 0; p < values.intensity.size(); ++p) {
        if (is_defined(values.intensity[p] + values.index[p] + values.curvature[p])) {
            spectra.index.push_back(values.index[p]);
            spectra.curvature.push_back(values.curvature[p]);
            amplitude.push_back(values.intensity[p]);
            functions.push_back(
                {1.0, sample.directions[p][0], sample.directions[p][1], sample.directions[p][2]});
        }
        if (polarized == nullptr) continue;
        if (!is_defined(values.q[p] + values.u[p] + values.index_of_polarization()[p] +
                        values.curvature_of_polarization()[p]))
            continue;
        polarized_spectra.index.push_back(values.index_of_polarization()[p]);
        polarized_spectra.curvature.push_back(values.curvature_of_polarization()[p]);
        q.push_back(values.q[p]);
        u.push_back(values.u[p]);
    }
    const DipoleFit fit(std::move(functions));
    const Matrix components = component_values(spectra, intensity, sky.reference);
    const Matrix polarized_components =
        polarized != nullptr ? component_values(polarized_spectra, *polarized, sky.polarization->reference)
                             : Matrix();
    parallel_for_blocks(static_cast<std::int64_t>(channels.size()), 1, [&](std::int64_t begin, std::int64_t) {
        const auto c = static_cast<std::size_t>(begin);
        Compared i = compare(spectra, components, intensity.weights, c, channels[c].band, sky.reference);
        for (std::size_t p = 0; p < amplitude.size(); ++p) {
            i.error[p] *= amplitude[p];
            i.truth[p] *= amplitude[p];
        }
        errors.relative[c] = ratio(fit.rms_without(i.error), fit.rms_without(i.truth));
        if (polarized == nullptr) return;
        const Compared p = compare(polarized_spectra, polarized_components, polarized->weights, c,
                                   channels[c].band, sky.polarization->reference);
        errors.relative[c] =
            std::max(errors.relative[c], ratio(rms_of_both(q, u, p.error), rms_of_both(q, u, p.truth)));
    });
    return errors;
}

}  // namespace foreglow
