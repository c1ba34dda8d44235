// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/palette.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "base/error.h"

namespace foreglow {
namespace {

OklabColour formula(PaletteKind kind, double t) {
    constexpr double pi = std::numbers::pi;
    const double s = 2 * t - 1, size = std::abs(s);
    switch (kind) {
        case PaletteKind::Sequential:
            return {0.20 + 0.76 * t, 0.125 * std::sin(pi * t) + 0.02, 215 + 210 * t};
        case PaletteKind::Diverging:
            return {0.96 - 0.60 * size, 0.125 * std::sin(0.75 * pi * size), s < 0 ? 250.0 : 50.0};
        case PaletteKind::Grey:
            break;
    }
    return {0.12 + 0.85 * t, 0, 0};
}

}  // namespace

PaletteKind parse_palette(const std::string& text) {
    if (text == "sequential") return PaletteKind::Sequential;
    if (text == "diverging") return PaletteKind::Diverging;
    if (text == "grey") return PaletteKind::Grey;
    throw InputError("palette '" + text + "' is not known: write sequential, diverging or grey");
}

Palette::Palette(PaletteKind kind) {
    colours_.reserve(steps);
    for (int i = 0; i < steps; ++i) {
        colours_.push_back(to_rgb(formula(kind, i / (steps - 1.0))));
    }
}

}  // namespace foreglow
