// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <functional>
#include <memory>
#include <string_view>

namespace foreglow {

/// Receives the outlines of letters: y grows downwards, lengths in picture pixels from the text's start on
/// its baseline.
struct OutlineSink {
    std::function<void(double, double)> move_to, line_to;
    std::function<void(double, double, double, double, double, double)> curve_to;
};

/// The letters of every picture: DejaVu Sans, outlines by FreeType, the same shapes on every machine.
class Typeface {
  public:
    /// Reads the font file.
    /// @throws FileError where the Debian package fonts-dejavu-core is not installed or its file cannot be
    /// used
    Typeface();
    ~Typeface();
    Typeface(Typeface&&) noexcept;
    Typeface& operator=(Typeface&&) noexcept;

    /// Returns the width of UTF-8 text in pixels at a size in pixels per em.
    [[nodiscard]] double width(std::string_view text, double size) const;
    /// Hands the outlines of UTF-8 text to a sink.
    void trace(std::string_view text, double size, const OutlineSink& sink) const;

  private:
    struct Implementation;
    std::unique_ptr<Implementation> implementation_;
};

/// Checks that pictures can be lettered here, so that a long run fails before its work and not after it.
/// @throws FileError as Typeface does
void check_typeface();

}  // namespace foreglow
