// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace foreglow {

/// One line of a chart; points that are not finite, or not positive on a log axis, are left out and break the
/// line.
struct ChartSeries {
    std::string label;         ///< in the legend; with its unit where it differs from the axis
    std::vector<double> x, y;  ///< the same length
    std::vector<double>
        half_widths;  ///< of horizontal bars (bandwidths), in units of x; empty, or the same length
    bool has_line = true;
    bool has_marks = true;
};

struct ChartAxis {
    std::string label;  ///< with its unit: "Frequency [GHz]"
    bool is_log = false;
    std::optional<double> low, high;  ///< from the data where open
};

/// A line chart.
struct Chart {
    std::string title;        ///< for readers who do not see it, and in the tool tip
    std::string description;  ///< what it shows, in a sentence or two
    ChartAxis x, y;
    std::vector<ChartSeries> series;
};

/// Writes a chart as one <svg> element: 720 x 400 units, scales with its page, draws axes and letters in the
/// page's own text colour, tells lines apart by colour, dash and mark, and has <title> and <desc>. The same
/// chart gives the same bytes.
///
/// A log axis without any positive value becomes linear.
/// @param id  starts the ids inside, so that several charts can stand in one page: letters, digits and '-'
[[nodiscard]] std::string write_svg(const Chart& chart, const std::string& id);

}  // namespace foreglow
