// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/detail_spectrum.h"

#include <algorithm>
#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "base/text.h"
#include "io/csv_table.h"
#include "sphere/beam.h"

namespace foreglow {
namespace {

constexpr const char* example_header = "l,TT,EE,BB,TE";

std::vector<double> zeros(int lmax) {
    return std::vector<double>(static_cast<std::size_t>(lmax) + 1, 0.0);
}

std::vector<double> power_law(double amplitude, double slope, double pivot, int lmax) {
    std::vector<double> cl = zeros(lmax);
    for (std::size_t l = 2; l < cl.size(); ++l)
        cl[l] = amplitude * std::pow(static_cast<double>(l) / pivot, slope);
    return cl;
}

std::vector<double> given_power_law(const PowerLawSpec& law, Frequency reference, int lmax) {
    const double kelvin = rayleigh_jeans_per_unit(law.amplitude.unit, reference, 1.0);
    const double cl =
        2 * constants::pi * law.amplitude.value * kelvin * kelvin / (law.pivot * (law.pivot + 1));
    return power_law(cl, law.slope, law.pivot, lmax);
}

std::vector<double> law_or_fit(const std::optional<PowerLawSpec>& law, const std::optional<SpectrumFit>& fit,
                               Frequency reference, int lmax) {
    if (law) return given_power_law(*law, reference, lmax);
    FOREGLOW_EXPECTS(fit.has_value());
    return power_law(fit->amplitude, fit->slope, fit->pivot, lmax);
}

/// The columns of a table of spectra, on l = 0..lmax.
class SpectrumTable {
  public:
    SpectrumTable(const std::filesystem::path& path, int lmax)
        : table_(read_csv_table(path, "spectrum file", example_header)), lmax_(lmax) {
        const auto fail = [&](const std::string& message) {
            throw DataError(table_.header_place() + ": " + message);
        };
        if (table_.header.empty() || table_.header.front() != "l")
            fail(std::string("the first column must be l: write the header as ") + example_header);
        for (const std::string& name : table_.header)
            if (name != "l" && name != "TT" && name != "EE" && name != "BB" && name != "TE")
                fail("there is no column '" + name +
                     "' in a table of spectra: there are l, TT, EE, BB, TE (K_RJ^2)");
        if (!has("TT")) fail("the column TT is missing");
        if (table_.rows.empty()) fail("there are no rows");
        for (std::size_t r = 0; r < table_.rows.size(); ++r) {
            const double l = table_.rows[r][0];
            if (!(l >= 0 && l == std::floor(l)) || (r > 0 && l != table_.rows[r - 1][0] + 1))
                throw DataError(table_.place(r) + ": l must be whole and rise by 1 from row to row, but is " +
                                format_exact(l));
        }
    }
    [[nodiscard]] bool has(const std::string& name) const {
        return std::find(table_.header.begin(), table_.header.end(), name) != table_.header.end();
    }
    [[nodiscard]] std::vector<double> column(const std::string& name, bool may_be_negative) const {
        const auto at = static_cast<std::size_t>(std::find(table_.header.begin(), table_.header.end(), name) -
                                                 table_.header.begin());
        std::vector<double> cl = zeros(lmax_);
        for (std::size_t r = 0; r < table_.rows.size(); ++r) {
            const double value = table_.rows[r][at];
            if (value < 0 && !may_be_negative)
                throw DataError(table_.place(r) + ": " + name + " is negative: a power spectrum is not");
            const double l = table_.rows[r][0];
            if (l >= 2 && l <= lmax_) cl[static_cast<std::size_t>(l)] = value;
        }
        return cl;
    }
    /// Returns C_TE / sqrt(C_TT C_EE), 0 where there is no power.
    [[nodiscard]] std::vector<double> correlation(const SkySpectra& sky) const {
        std::vector<double> te = column("TE", true);
        for (std::size_t r = 0; r < table_.rows.size(); ++r) {
            const double row_l = table_.rows[r][0];
            if (row_l < 2 || row_l > lmax_) continue;
            const auto l = static_cast<std::size_t>(row_l);
            const double power = std::sqrt(sky.tt[l] * sky.ee[l]);
            if (!(std::abs(te[l]) <= power * (1 + 1e-9)))
                throw DataError(table_.place(r) +
                                ": TE is larger than sqrt(TT EE): no field has such spectra");
            te[l] = power > 0 ? std::clamp(te[l] / power, -1.0, 1.0) : 0.0;
        }
        return te;
    }

  private:
    CsvTable table_;
    int lmax_;
};

SkySpectra tabulated(const DetailSpec& spec, bool polarized, int lmax) {
    const SpectrumTable table(*spec.spectrum, lmax);
    SkySpectra sky;
    sky.tt = table.column("TT", false);
    if (!polarized) return sky;
    if (!table.has("EE"))
        throw InputError(spec.spectrum->filename().string() +
                         " has no column EE, and the study asks for IQU: add one, or set `stokes = \"I\"`");
    sky.ee = table.column("EE", false);
    sky.bb = table.has("BB") ? table.column("BB", false) : sky.ee;
    if (!table.has("BB"))
        for (double& value : sky.bb)
            value *= spec.b_to_e;
    sky.correlation =
        table.has("TE") ? table.correlation(sky) : std::vector<double>(sky.tt.size(), spec.te_correlation);
    return sky;
}

}  // namespace

SkySpectra make_sky_spectra(const DetailSpec& spec, const SpectrumSources& sources, int lmax) {
    if (spec.spectrum) return tabulated(spec, sources.polarized, lmax);
    SkySpectra sky;
    sky.tt = law_or_fit(spec.intensity, sources.intensity_fit, sources.intensity_reference, lmax);
    if (!sources.polarized) return sky;
    sky.ee = law_or_fit(spec.polarization, sources.polarization_fit, sources.polarization_reference, lmax);
    sky.bb = sky.ee;
    for (double& value : sky.bb)
        value *= spec.b_to_e;
    sky.correlation.assign(sky.tt.size(), spec.te_correlation);
    return sky;
}

DetailSpectra make_complement(const SkySpectra& sky, Angle intensity_beam, Angle polarization_beam) {
    const int lmax = static_cast<int>(sky.tt.size()) - 1;
    const auto bt = make_gaussian_beam(intensity_beam, lmax).temperature;
    const auto bp = make_gaussian_beam(polarization_beam, lmax).polarization;
    DetailSpectra out;
    out.tt = sky.tt;
    out.ee = sky.ee;
    out.bb = sky.bb;
    out.correlation = sky.correlation;
    for (std::size_t l = 0; l < out.tt.size(); ++l) {
        const double rest_t = std::max(0.0, 1 - bt[l] * bt[l]), rest_p = std::max(0.0, 1 - bp[l] * bp[l]);
        out.tt[l] *= l < 2 ? 0.0 : rest_t;
        if (out.ee.empty()) continue;
        out.ee[l] *= l < 2 ? 0.0 : rest_p;
        out.bb[l] *= l < 2 ? 0.0 : rest_p;
        const double rest = std::sqrt(rest_t * rest_p);
        double& rho = out.correlation[l];
        rho = l < 2 || rest <= 0 ? 0.0 : rho * (1 - bt[l] * bp[l]) / rest;
    }
    raise_correlation(out, 1.0);
    return out;
}

void raise_correlation(DetailSpectra& spectra, double overlap) {
    FOREGLOW_EXPECTS(overlap > 0);
    for (double& rho : spectra.correlation) {
        rho /= overlap;
        spectra.largest_correlation = std::max(spectra.largest_correlation, std::abs(rho));
        if (std::abs(rho) > 1) ++spectra.capped;
        rho = std::clamp(rho, -1.0, 1.0);
    }
}

}  // namespace foreglow
