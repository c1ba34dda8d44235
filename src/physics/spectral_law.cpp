// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/spectral_law.h"

#include <cmath>

namespace foreglow {

double log_frequency_ratio(Frequency a, Frequency b) {
    return std::log(a.hz() / b.hz());
}

}  // namespace foreglow
