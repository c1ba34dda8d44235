// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "picture/value_scale.h"

namespace foreglow {

/// A labelled value on an axis or a colour bar; position 0 is the low end and 1 the high end.
struct Tick {
    double value = 0;
    double position = 0;
    std::string label;
};

/// Chooses round values along a scale, as many as their labels leave room for, and two at the least where
/// there are two.
/// @param label_share  returns the length of a label as a share of the axis
[[nodiscard]] std::vector<Tick> make_ticks(const ValueScale& scale,
                                           const std::function<double(const std::string&)>& label_share);

/// Writes a number for a picture: with a true minus sign, and as 2x10^-5 in superscripts below 1e-3 and from
/// 1e5 on.
/// @param digits  significant digits at the most
[[nodiscard]] std::string format_label(double value, int digits = 6);

}  // namespace foreglow
