// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/spectral_stencil.h"

#include <cmath>

namespace foreglow {

Frequency SpectralStencil::frequency(std::size_t k) const {
    if (k == count / 2) return middle_;
    return Frequency::from_hz(middle_.hz() * std::exp(step_ * (static_cast<double>(k) - 2)));
}

}  // namespace foreglow
