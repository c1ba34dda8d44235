// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/sky_axes.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <vector>

#include "picture/ink.h"
#include "picture/ticks.h"
#include "sphere/projection.h"

namespace foreglow {
namespace {

constexpr double degree = std::numbers::pi / 180;

/// A light line over a wider dark one shows on every colour of a palette.
void stroke_on_map(Canvas& canvas, const std::vector<Point>& points, double font_size) {
    canvas.stroke(points, {ink, 2 * hairline(font_size), 0.16});
    canvas.stroke(points, {paper, hairline(font_size), 0.4});
}

Point on_ellipse(const Box& bounds, double longitude_deg, double latitude_deg) {
    // Not by way of a direction: the two edges of the ellipse are the same meridian.
    const double y = Mollweide().position_of(direction_of({}, Angle::from_degrees(latitude_deg))).y;
    const double x = -longitude_deg / 180 * std::sqrt(std::max(0.0, 1 - y * y));
    return {bounds.x + (1 + x) / 2 * bounds.width, bounds.y + (1 - y) / 2 * bounds.height};
}

std::string degrees_label(double value) {
    return format_label(std::abs(value) < 1e-9 ? 0 : value, 9) + "\u00b0";
}

std::string latitude_label(double latitude) {
    std::string label = latitude > 1e-9 ? "+" : "";
    label += degrees_label(latitude);
    return label;
}

double full_circle(double longitude) {
    const double turned = std::fmod(std::fmod(longitude, 360) + 360, 360);
    return turned > 360 - 1e-9 ? 0 : turned;
}

double round_step(double wanted) {
    constexpr std::array<double, 16> steps{0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1, 0.2,
                                           0.5,   1,     2,     5,    10,   15,   20,  30};
    const auto distance = [wanted](double step) { return std::abs(std::log(step / wanted)); };
    return *std::min_element(steps.begin(), steps.end(),
                             [&](double a, double b) { return distance(a) < distance(b); });
}

/// Writes on the map itself, light on dark or dark on light, whichever stands out there.
void text_on_map(Canvas& canvas, double x, double baseline, const std::string& label, double f) {
    const double half = canvas.text_width(label, f) / 2;
    double lightness = 0;
    int count = 0;
    for (double px = x - half; px <= x + half; px += 2)
        for (double py = baseline - 0.8 * f; py <= baseline; py += 2) {
            if (px < 0 || py < 0 || px >= canvas.width() || py >= canvas.height()) continue;
            lightness += oklab_lightness(canvas.pixel(static_cast<int>(px), static_cast<int>(py)));
            ++count;
        }
    const bool is_light = lightness > 0.62 * count;
    canvas.text(x, baseline, label,
                {.size = f,
                 .colour = is_light ? ink : paper,
                 .align = Align::Centre,
                 .halo = 0.14 * f,
                 .halo_colour = is_light ? paper : ink});
}

struct FieldView {
    const Box& bounds;
    Gnomonic plane;
    double half;  ///< half the side in the tangent plane

    [[nodiscard]] std::optional<Point> at(double longitude, double latitude) const {
        const auto place =
            plane.position_of(direction_of(Angle::from_degrees(longitude), Angle::from_degrees(latitude)));
        const double far = 20 * half;  // beyond it coordinates may leave what Cairo can hold
        if (!place || std::abs(place->x) > far || std::abs(place->y) > far) return std::nullopt;
        return Point{bounds.x + (1 + place->x / half) / 2 * bounds.width,
                     bounds.y + (1 - place->y / half) / 2 * bounds.height};
    }
    /// Returns longitude and latitude [deg] at shares of the square's sides, u to the right and v downwards.
    [[nodiscard]] std::array<double, 2> sky(double u, double v) const {
        const Vector3 d = plane.direction_at((2 * u - 1) * half, (1 - 2 * v) * half).value();
        return {longitude_of(d).degrees(), latitude_of(d).degrees()};
    }
};

void stroke_curve(Canvas& canvas, const FieldView& view, double font_size, bool meridian, double fixed,
                  double from, double to) {
    constexpr int pieces = 180;
    std::vector<Point> points;
    for (int i = 0; i <= pieces; ++i) {
        const double moving = from + (to - from) * i / pieces;
        const auto p = meridian ? view.at(fixed, moving) : view.at(moving, fixed);
        if (p) points.push_back(*p);
        if ((!p || i == pieces) && points.size() > 1) stroke_on_map(canvas, points, font_size);
        if (!p) points.clear();
    }
}

struct Crossing {
    double place;  ///< 0 to 1 along the side
    double value;  ///< the round coordinate [deg]
};

/// Finds where round values of a coordinate cross a side, from its values at many places along it.
std::vector<Crossing> find_crossings(const std::vector<double>& along, double step) {
    std::vector<Crossing> found;
    for (std::size_t i = 1; i < along.size(); ++i) {
        const double a = along[i - 1];
        const double b = a + std::remainder(along[i] - a, 360);
        const double first = std::ceil(std::min(a, b) / step - 1e-9);
        for (double n = first; n * step <= std::max(a, b); ++n) {
            if (a == b || std::abs(n * step - b) < 1e-12) continue;
            found.push_back({(static_cast<double>(i - 1) + (n * step - a) / (b - a)) /
                                 static_cast<double>(along.size() - 1),
                             n * step});
        }
    }
    return found;
}

enum class Side { Bottom, Left, Top, Right };

/// One side of the square: its values of a coordinate, the places of its labels and which way is out.
struct Rim {
    Side side;
    const FieldView& view;

    [[nodiscard]] bool is_level() const { return side == Side::Bottom || side == Side::Top; }
    [[nodiscard]] double outwards() const { return side == Side::Bottom || side == Side::Right ? 1 : -1; }
    [[nodiscard]] std::vector<double> values(std::size_t coordinate) const {
        std::vector<double> along;
        const double fixed = outwards() > 0 ? 1 : 0;
        for (int i = 0; i <= 400; ++i)
            along.push_back(
                (is_level() ? view.sky(i / 400.0, fixed) : view.sky(fixed, i / 400.0))[coordinate]);
        return along;
    }
    [[nodiscard]] Point at(double place, double out) const {
        const Box& b = view.bounds;
        const double shift = out * outwards(), end = outwards() > 0 ? 1 : 0;
        return is_level() ? Point{b.x + place * b.width, b.y + end * b.height + shift}
                          : Point{b.x + end * b.width + shift, b.y + place * b.height};
    }
};

std::string coordinate_label(std::size_t coordinate, double value) {
    return coordinate == 0 ? degrees_label(full_circle(value)) : latitude_label(value);
}

/// Labels round values of a coordinate (0 longitude, 1 latitude) outside one side, leaving out what would
/// overlap.
void label_rim(Canvas& canvas, const Rim& rim, std::size_t coordinate, double step, double f) {
    const double length = rim.is_level() ? rim.view.bounds.width : rim.view.bounds.height;
    double free_from = -4 * f;
    for (const Crossing& c : find_crossings(rim.values(coordinate), step)) {
        const std::string label = coordinate_label(coordinate, c.value);
        const double half = rim.is_level() ? canvas.text_width(label, f) / 2 : 0.5 * f;
        canvas.stroke(std::array<Point, 2>{rim.at(c.place, 0), rim.at(c.place, 0.35 * f)},
                      {ink, hairline(f)});
        if (c.place * length - half < free_from) continue;
        free_from = c.place * length + half + 0.5 * f;
        const Point p = rim.at(c.place, 0.6 * f);
        const double baseline = rim.side == Side::Bottom ? p.y + 0.85 * f
                                : rim.is_level()         ? p.y
                                                         : p.y + 0.36 * f;
        canvas.text(p.x, std::round(baseline), label,
                    {.size = f,
                     .colour = ink,
                     .align = rim.is_level()           ? Align::Centre
                              : rim.side == Side::Left ? Align::Right
                                                       : Align::Left});
    }
}

/// Labels the rings around a pole on the map, along the meridian through the middle of the field.
void label_rings(Canvas& canvas, const FieldView& view, const CloseUpField& field, double step, double f) {
    const Box& b = view.bounds;
    const double sign = field.latitude.degrees() < 0 ? -1 : 1;
    for (double ring = 90 - step; ring > 0; ring -= step) {
        const auto p = view.at(field.longitude.degrees(), sign * ring);
        const double margin = 1.5 * f;
        if (!p || p->y < b.y + margin || p->y > b.y + b.height - margin) continue;
        text_on_map(canvas, p->x, std::round(p->y + 0.36 * f), latitude_label(sign * ring), f);
    }
}

struct Lines {
    double longitude_step, latitude_step, reach_longitude, low, high;
};

/// Chooses the lines of a field; the corners of the square are up to sqrt(2) further off than its sides.
Lines make_lines(const CloseUpField& field) {
    const double size = field.size.degrees(), latitude = field.latitude.degrees();
    const double low = std::max(-90.0, latitude - 0.75 * size), high = std::min(90.0, latitude + 0.75 * size);
    if (has_pole(field)) return {30, std::min(10.0, round_step(size / 5)), 180, low, high};
    const double narrowing = std::cos(latitude * degree);
    const double farthest = std::cos(std::min(89.0, std::abs(latitude) + 0.5 * size) * degree);
    return {round_step(size / 5 / narrowing), round_step(size / 5), std::min(180.0, 0.75 * size / farthest),
            low, high};
}

}  // namespace

CoordinateNames coordinate_names(Frame frame) {
    switch (frame) {
        case Frame::Icrs:
            return {"ICRS", "Right ascension", "Declination"};
        case Frame::Ecliptic:
            return {"Ecliptic", "Ecliptic longitude", "Ecliptic latitude"};
        case Frame::Galactic:
            break;
    }
    return {"Galactic", "Galactic longitude", "Galactic latitude"};
}

void draw_ellipse_graticule(Canvas& canvas, const Box& bounds, double f) {
    for (int longitude = -120; longitude <= 120; longitude += 60) {
        std::vector<Point> points;
        for (double latitude = -90; latitude <= 90; latitude += 1)
            points.push_back(on_ellipse(bounds, longitude, latitude));
        stroke_on_map(canvas, points, f);
    }
    for (int latitude = -60; latitude <= 60; latitude += 30) {
        const Point left = on_ellipse(bounds, 180, latitude), right = on_ellipse(bounds, -180, latitude);
        stroke_on_map(canvas, {left, right}, f);
        canvas.text(left.x - 0.5 * f,
                    std::round(left.y + 0.36 * f + (latitude == 0 ? 0 : -0.02 * latitude / 3 * f)),
                    latitude_label(latitude), {.size = f, .colour = ink, .align = Align::Right});
    }
    for (int longitude = -120; longitude <= 120; longitude += 60) {
        const Point p = on_ellipse(bounds, longitude, 0);
        canvas.text(
            p.x, std::round(p.y + 1.35 * f), degrees_label(full_circle(longitude)),
            {.size = f, .colour = ink, .align = Align::Centre, .halo = 0.16 * f, .halo_colour = paper});
    }
}

bool has_pole(const CloseUpField& field) {
    return std::abs(field.latitude.degrees()) + 0.5 * field.size.degrees() >= 88;
}

void draw_field_graticule(Canvas& canvas, const Box& bounds, const CloseUpField& field, double f) {
    const FieldView view{bounds, Gnomonic(field.longitude, field.latitude),
                         std::tan(field.size.radians() / 2)};
    const Lines lines = make_lines(field);
    const double middle = field.longitude.degrees(), wide = lines.reach_longitude;
    const double a = lines.longitude_step, b = lines.latitude_step;
    canvas.clip(bounds);
    for (double n = std::ceil((middle - wide) / a); n * a <= middle + wide + 1e-9; ++n)
        stroke_curve(canvas, view, f, true, n * a, lines.low, lines.high);
    for (double n = std::ceil(lines.low / b); n * b <= lines.high + 1e-9; ++n)
        stroke_curve(canvas, view, f, false, n * b, middle - wide, middle + wide);
    canvas.release();
    label_rim(canvas, {Side::Bottom, view}, 0, a, f);
    if (!has_pole(field)) {
        label_rim(canvas, {Side::Left, view}, 1, b, f);
        return;
    }
    for (const Side side : {Side::Left, Side::Top, Side::Right})
        label_rim(canvas, {side, view}, 0, a, f);
    label_rings(canvas, view, field, b, f);
}

}  // namespace foreglow
