// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/lognormal_spectrum.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"
#include "sphere/angular_correlation.h"

namespace foreglow {

LognormalSpectrum make_lognormal_spectrum(std::span<const double> cl) {
    FOREGLOW_EXPECTS(!cl.empty());
    const int lmax = static_cast<int>(cl.size()) - 1;
    const AngularCorrelation transform(lmax, 2 * (lmax + 1));
    std::vector<double> xi = transform.from_spectrum(cl);
    for (double& value : xi) {
        if (!(value > -1))
            throw NumericError(
                "no lognormal field has the detail's spectrum: its correlation falls below -1; give a "
                "smaller "
                "amplitude, or form = \"additive\"");
        value = std::log1p(value);
    }
    LognormalSpectrum out;
    out.cl = transform.to_spectrum(xi);
    for (std::size_t l = 0; l < out.cl.size(); ++l) {
        if (out.cl[l] >= 0) continue;
        out.clipped -= (2 * static_cast<double>(l) + 1) * out.cl[l];
        out.cl[l] = 0;
    }
    out.variance = variance_of_spectrum(out.cl);
    if (out.variance > 0) out.clipped /= 4 * constants::pi * out.variance;
    return out;
}

}  // namespace foreglow
