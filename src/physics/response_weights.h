// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

namespace foreglow {

/// What a channel's transmission tau(nu) responds to (Planck 2013 IX; common practice):
/// power in a single-moded feed (w = tau), specific intensity (w = tau nu^2), or photon counts (w = tau nu),
/// where w weighs K_RJ.
enum class ResponseWeights { Temperature, Radiance, Photon };

}  // namespace foreglow
