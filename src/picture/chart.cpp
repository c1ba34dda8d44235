// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/chart.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdio>
#include <limits>

#include "base/error.h"
#include "picture/colour.h"
#include "picture/markup.h"
#include "picture/ticks.h"
#include "picture/value_scale.h"

namespace foreglow {
namespace {

constexpr double width = 720, height = 400, left = 94, right = 20, top = 14, bottom = 58, letter = 14;
constexpr double plot_width = width - left - right, legend_row = 22;

std::string coordinate(double value) {
    std::array<char, 32> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "%.2f", value);
    std::string text(buffer.data());
    text.erase(text.find_last_not_of('0') + 1);
    if (text.back() == '.') text.pop_back();
    return text == "-0" ? "0" : text;
}

/// Estimates a text's length: a page's own sans-serif letters are 0.58 em wide on average, digits included.
double rough_length(const std::string& text) {
    const auto letters = std::count_if(
        text.begin(), text.end(), [](char c) { return (static_cast<unsigned char>(c) & 0xC0U) != 0x80U; });
    return 0.58 * letter * static_cast<double>(letters);
}

bool is_shown(double value, bool is_log) {
    return std::isfinite(value) && (!is_log || value > 0);
}

/// Chooses the scale of one axis, with a margin of 4 % so that marks do not sit on the frame.
ValueScale make_scale(const ChartAxis& axis, const std::vector<double>& values) {
    double low = std::numeric_limits<double>::infinity(), high = -low;
    const bool is_log =
        axis.is_log && std::any_of(values.begin(), values.end(), [](double v) { return is_shown(v, true); });
    for (const double v : values)
        if (is_shown(v, is_log)) {
            low = std::min(low, v);
            high = std::max(high, v);
        }
    if (low > high) low = high = is_log ? 1 : 0;
    if (is_log) {
        const double margin = low < high ? std::pow(high / low, 0.04) : 2;
        low /= margin;
        high *= margin;
    } else {
        const double margin = low < high ? 0.04 * (high - low) : std::max(0.1 * std::abs(low), 1e-12);
        low -= margin;
        high += margin;
    }
    low = axis.low.value_or(low);
    high = axis.high.value_or(high);
    return {is_log ? ScaleKind::Log : ScaleKind::Linear, low, high};
}

struct Style {
    Rgb colour;
    const char* dash;
    int mark;
};

/// Six hues of one lightness, which reads on white and on dark paper alike; dashes and marks carry the rest.
Style style_of(std::size_t index) {
    constexpr std::array<double, 6> hues{255, 45, 165, 330, 95, 205};
    constexpr std::array<const char*, 4> dashes{"", "7 4", "2 3", "10 3 2 3"};
    return {to_rgb({0.62, 0.15, hues.at(index % hues.size())}), dashes.at(index % dashes.size()),
            static_cast<int>(index % 4)};
}

std::string colour_text(Rgb c) {
    std::array<char, 8> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "#%02x%02x%02x", c.red, c.green, c.blue);
    return buffer.data();
}

std::string mark(int kind, double x, double y, const std::string& colour) {
    const auto start = [](double px, double py) { return join({coordinate(px), " ", coordinate(py)}); };
    std::string shape;
    switch (kind) {
        case 0:
            shape = join({start(x - 3.6, y), "a3.6 3.6 0 1 0 7.2 0a3.6 3.6 0 1 0 -7.2 0z"});
            break;
        case 1:
            shape = join({start(x - 3.3, y - 3.3), "h6.6v6.6h-6.6z"});
            break;
        case 2:
            shape = join({start(x, y - 4.4), "l4.2 7.4h-8.4z"});
            break;
        default:
            shape = join({start(x, y - 4.6), "l4.6 4.6l-4.6 4.6l-4.6 -4.6z"});
    }
    return join({"<path d=\"M", shape, "\" fill=\"", colour, "\"/>\n"});
}

std::string text_element(double x, double y, const std::string& anchor, const std::string& text,
                         const std::string& more = "") {
    return "<text x=\"" + coordinate(x) + "\" y=\"" + coordinate(y) + "\" text-anchor=\"" + anchor + "\"" +
           more + ">" + escape_markup(text) + "</text>\n";
}

/// Where the frame of the plot stands; the legend above it takes as many rows as its labels need.
struct Plot {
    const Chart& chart;
    ValueScale x_scale, y_scale;
    double plot_top, plot_bottom;

    [[nodiscard]] double x(double value) const { return left + x_scale.position(value) * plot_width; }
    [[nodiscard]] double y(double value) const {
        return plot_bottom - y_scale.position(value) * (plot_bottom - plot_top);
    }
    [[nodiscard]] bool shows(double vx, double vy) const {
        return is_shown(vx, x_scale.kind() == ScaleKind::Log) &&
               is_shown(vy, y_scale.kind() == ScaleKind::Log);
    }
};

std::string write_axes(const Plot& plot) {
    const double plot_height = plot.plot_bottom - plot.plot_top;
    std::string grid, labels;
    for (const Tick& tick : make_ticks(plot.x_scale, [](const std::string& text) {
             return (rough_length(text) + 1.4 * letter) / plot_width;
         })) {
        grid += join({"M", coordinate(plot.x(tick.value)), " ", coordinate(plot.plot_top), "V",
                      coordinate(plot.plot_bottom)});
        labels += text_element(plot.x(tick.value), plot.plot_bottom + 1.4 * letter, "middle", tick.label);
    }
    for (const Tick& tick :
         make_ticks(plot.y_scale, [&](const std::string&) { return 2.2 * letter / plot_height; })) {
        grid += join(
            {"M", coordinate(left), " ", coordinate(plot.y(tick.value)), "H", coordinate(width - right)});
        labels += text_element(left - 8, plot.y(tick.value) + 0.35 * letter, "end", tick.label);
    }
    std::string out =
        "<path d=\"" + grid + "\" fill=\"none\" stroke=\"currentColor\" stroke-opacity=\"0.16\"/>\n";
    out += "<rect x=\"" + coordinate(left) + "\" y=\"" + coordinate(plot.plot_top) + "\" width=\"" +
           coordinate(plot_width) + "\" height=\"" + coordinate(plot_height) +
           "\" fill=\"none\" stroke=\"currentColor\" stroke-opacity=\"0.6\"/>\n";
    out += "<g fill=\"currentColor\">\n" + labels;
    out += text_element(left + plot_width / 2, plot.plot_bottom + 3.3 * letter, "middle", plot.chart.x.label);
    const double middle = (plot.plot_top + plot.plot_bottom) / 2;
    out += text_element(18, middle, "middle", plot.chart.y.label,
                        " transform=\"rotate(-90 18 " + coordinate(middle) + ")\"");
    return out + "</g>\n";
}

std::string write_series(const Plot& plot, const ChartSeries& series, const Style& style) {
    const std::string colour = colour_text(style.colour);
    std::string line, marks, bars;
    bool pen_down = false;
    for (std::size_t i = 0; i < series.x.size(); ++i) {
        const double vx = series.x[i], vy = series.y[i];
        if (!plot.shows(vx, vy)) {
            pen_down = false;
            continue;
        }
        line += join({pen_down ? "L" : "M", coordinate(plot.x(vx)), " ", coordinate(plot.y(vy))});
        pen_down = true;
        if (series.has_marks) marks += mark(style.mark, plot.x(vx), plot.y(vy), colour);
        if (series.half_widths.empty() || !(series.half_widths[i] > 0)) continue;
        const double low = std::clamp(plot.x_scale.position(vx - series.half_widths[i]), 0.0, 1.0);
        const double high = std::clamp(plot.x_scale.position(vx + series.half_widths[i]), 0.0, 1.0);
        bars += join({"M", coordinate(left + low * plot_width), " ", coordinate(plot.y(vy)), "H",
                      coordinate(left + high * plot_width)});
    }
    std::string out;
    if (series.has_line && !line.empty()) {
        out += "<path d=\"" + line + "\" fill=\"none\" stroke=\"" + colour +
               "\" stroke-width=\"2\" stroke-linejoin=\"round\"";
        if (*style.dash != '\0') out += std::string(" stroke-dasharray=\"") + style.dash + "\"";
        out += "/>\n";
    }
    if (!bars.empty())
        out += "<path d=\"" + bars + "\" fill=\"none\" stroke=\"" + colour +
               "\" stroke-width=\"3\" stroke-opacity=\"0.5\"/>\n";
    return out + marks;
}

struct LegendPlace {
    double x, y;
};

/// Sets the legend's entries in rows; a single unnamed line needs none.
std::vector<LegendPlace> place_legend(const Chart& chart) {
    std::vector<LegendPlace> places;
    if (chart.series.size() == 1 && chart.series[0].label.empty()) return places;
    double x = left, y = top + letter;
    for (const ChartSeries& series : chart.series) {
        const double length = 44 + rough_length(series.label);
        if (x > left && x + length > width - right) {
            x = left;
            y += legend_row;
        }
        places.push_back({x, y});
        x += length + 18;
    }
    return places;
}

std::string write_legend(const Chart& chart, const std::vector<LegendPlace>& places) {
    std::string out;
    for (std::size_t i = 0; i < places.size(); ++i) {
        const Style style = style_of(i);
        const ChartSeries& series = chart.series[i];
        const double x = places[i].x, y = places[i].y - 0.35 * letter;
        if (series.has_line) {
            out += "<path d=\"M" + coordinate(x) + " " + coordinate(y) + "h34\" fill=\"none\" stroke=\"" +
                   colour_text(style.colour) + "\" stroke-width=\"2\"";
            if (*style.dash != '\0') out += std::string(" stroke-dasharray=\"") + style.dash + "\"";
            out += "/>\n";
        }
        if (series.has_marks) out += mark(style.mark, x + 17, y, colour_text(style.colour));
        out += text_element(x + 42, places[i].y, "start", series.label, " fill=\"currentColor\"");
    }
    return out;
}

Plot make_plot(const Chart& chart, double plot_top) {
    std::vector<double> xs, ys;
    for (const ChartSeries& series : chart.series) {
        FOREGLOW_EXPECTS(series.x.size() == series.y.size());
        FOREGLOW_EXPECTS(series.half_widths.empty() || series.half_widths.size() == series.x.size());
        for (std::size_t i = 0; i < series.x.size(); ++i) {
            if (!std::isfinite(series.y[i])) continue;
            const double half = series.half_widths.empty() ? 0 : series.half_widths[i];
            xs.insert(xs.end(), {series.x[i] - half, series.x[i], series.x[i] + half});
            ys.push_back(series.y[i]);
        }
    }
    return {chart, make_scale(chart.x, xs), make_scale(chart.y, ys), plot_top, height - bottom};
}

}  // namespace

std::string write_svg(const Chart& chart, const std::string& id) {
    const auto places = place_legend(chart);
    const Plot plot = make_plot(chart, places.empty() ? top : places.back().y + 12);
    const std::string title_id = escape_markup(id) + "-title", description_id = escape_markup(id) + "-desc";
    std::string out =
        "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 720 400\" role=\"img\" aria-labelledby=\"" +
        title_id + " " + description_id +
        "\" font-family=\"system-ui, 'DejaVu Sans', sans-serif\" font-size=\"14\">\n";
    out += "<title id=\"" + title_id + "\">" + escape_markup(chart.title) + "</title>\n";
    out += "<desc id=\"" + description_id + "\">" + escape_markup(chart.description) + "</desc>\n";
    out += write_legend(chart, places) + write_axes(plot);
    for (std::size_t i = 0; i < chart.series.size(); ++i)
        out += write_series(plot, chart.series[i], style_of(i));
    return out + "</svg>\n";
}

}  // namespace foreglow
