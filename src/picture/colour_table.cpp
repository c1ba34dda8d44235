// SPDX-License-Identifier: GPL-2.0-or-later
#include "picture/colour_table.h"

#include <limits>

#include "base/error.h"
#include "picture/ink.h"

namespace foreglow {
namespace {

constexpr int levels = 160, levels_under_lines = 20, greys = 24, faint_greys = 8;
constexpr std::size_t cells = 64UL * 64UL * 64UL;

}  // namespace

ColourTable::ColourTable(const Palette& palette) : known_(cells, -1) {
    for (int i = 0; i < levels; ++i)
        colours_.push_back(palette.at(i / (levels - 1.0)));
    for (int i = 0; i < levels_under_lines; ++i) {
        const Rgb colour = palette.at(i / (levels_under_lines - 1.0));
        colours_.push_back(mix(colour, paper, 0.2));  // the rim of a line or a letter, and its middle
        colours_.push_back(mix(colour, paper, 0.4));
    }
    for (int i = 0; i < greys; ++i)
        colours_.push_back(mix(paper, ink, i / (greys - 1.0)));
    for (int i = 1; i < faint_greys; ++i)
        colours_.push_back(mix(paper, faint_ink, i / (faint_greys - 1.0)));
    for (const Rgb flat : {undefined_colour, not_positive_colour}) {
        colours_.push_back(flat);
        colours_.push_back(mix(flat, paper, 0.4));
    }
    FOREGLOW_EXPECTS(colours_.size() <= 256);
}

std::int16_t ColourTable::search(Rgb colour) const {
    const auto middle = [](std::uint8_t part) { return (part & ~3) + 2; };
    const int red = middle(colour.red), green = middle(colour.green), blue = middle(colour.blue);
    int best = std::numeric_limits<int>::max();
    std::size_t found = 0;
    for (std::size_t i = 0; i < colours_.size(); ++i) {
        const int r = colours_[i].red - red, g = colours_[i].green - green, b = colours_[i].blue - blue;
        const int distance = r * r + g * g + b * b;
        if (distance < best) {
            best = distance;
            found = i;
        }
    }
    return static_cast<std::int16_t>(found);
}

}  // namespace foreglow
