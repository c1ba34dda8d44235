// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/at.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/interrupt.h"
#include "base/parallel.h"
#include "jobs/at_positions.h"
#include "jobs/at_rows.h"
#include "jobs/at_source.h"
#include "sphere/disc.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 4096;
constexpr std::size_t most_rows = 65536;                   // of a batch, all columns together
constexpr std::size_t most_pixels = std::size_t{1} << 20;  // of the discs of a batch

void check_options(const AtOptions& options) {
    if (options.disc && options.interpolate)
        throw InputError(
            "--disc and --interpolate contradict each other: a disc is a mean over whole pixels");
    if (options.disc && !(options.disc->degrees() > 0 && options.disc->degrees() <= 180))
        throw InputError("--disc is a radius above 0 and up to 180 deg");
    if (options.nside && !is_valid_nside(*options.nside))
        throw InputError("--nside must be a power of two from 1 to 8192, but is " +
                         std::to_string(*options.nside));
    if (options.nested && options.pixels.empty() && !options.positions_file)
        throw InputError("--nested is the order of pixel numbers: give them with --pixel");
}

/// Answers one request: turns positions into pixels, asks the source, takes means, writes rows.
class Answer {
  public:
    Answer(const AtOptions& options, AtSource source, const std::function<bool(std::string_view)>& write)
        : options_(options), source_(std::move(source)), write_(write) {
        style_.format = options.format;
        style_.frame = row_frame();
        style_.nside = source_.grid.nside();
        style_.has_brightness = source_.has_brightness;
        style_.polarized = source_.polarized;
        style_.with_disc = options.disc.has_value();
        style_.columns = source_.columns;
        style_.with_channel = !source_.columns.front().channel.empty();
        style_.negate_u = convention() == PolarizationConvention::Iau;
        to_source_ = rotation_between(style_.frame, source_.frame);
        from_source_ = rotation_between(source_.frame, style_.frame);
        if (options.nside) pixel_grid_.emplace(*options.nside);
        if (!options.pixels.empty() && !pixel_grid_) pixel_grid_ = source_.grid;
    }

    [[nodiscard]] PolarizationConvention convention() const {
        return options_.convention.value_or(source_.convention);
    }
    [[nodiscard]] std::vector<std::string> conventions() const;

    /// Takes the first positions, so that what is wrong with the request is said before anything is written.
    void prepare() {
        reader_ = std::make_unique<PositionReader>(options_, style_.frame, pixel_grid_);
        next_ = reader_->next();
    }
    void run() {
        if (!write_(write_row_heading(style_))) return;
        for (; next_; next_ = reader_->next()) {
            check_interrupt();
            if (!answer(*next_)) return;
        }
        static_cast<void>(write_(write_row_ending(style_, any_rows_)));
    }

  private:
    // Pixels are numbers of a grid, in the source's frame unless another is named.
    [[nodiscard]] Frame row_frame() const {
        const bool by_pixels = !options_.pixels.empty();
        return options_.frame.value_or(by_pixels ? source_.frame : Frame::Galactic);
    }
    [[nodiscard]] bool answer(const PositionBatch& batch);
    [[nodiscard]] bool write_part(const PositionBatch& batch, std::size_t first, std::size_t count);
    [[nodiscard]] Vector3 direction_in_source(const SkyPosition& position) const {
        const Vector3 n = direction_of(position);
        return style_.frame == source_.frame ? n : rotate(to_source_, n);
    }
    [[nodiscard]] bool takes_groups() const { return options_.disc || options_.interpolate; }
    [[nodiscard]] std::size_t largest_part() const;
    void find_pixels(const PositionBatch& batch, std::size_t first, std::size_t count);
    void make_groups(const PositionBatch& batch, std::size_t first, std::size_t count);
    void make_turns();

    const AtOptions& options_;
    AtSource source_;
    const std::function<bool(std::string_view)>& write_;
    RowStyle style_;
    Matrix3 to_source_{}, from_source_{};
    std::optional<HealpixGrid> pixel_grid_;
    bool any_rows_ = false;
    std::unique_ptr<PositionReader> reader_;
    std::optional<PositionBatch> next_;
    // Of the part being worked on:
    std::vector<std::int64_t> own_pixels_;  // that hold the positions, RING
    std::vector<Vector3> centres_;          // of the groups, in the source's frame
    PixelGroups groups_;
    std::vector<StokesTurn> turns_;
};

std::vector<std::string> Answer::conventions() const {
    std::string text = "positions and Q, U in " + to_text(style_.frame) + "; pixels are " +
                       (options_.nested ? "NESTED" : "RING") + " numbers of nside " +
                       std::to_string(source_.grid.nside()) + " in " + to_text(source_.frame);
    if (source_.has_brightness) text += "; brightness in " + source_.columns.front().unit;
    std::vector<std::string> lines{text};
    if (source_.has_index)
        lines.emplace_back(
            "index is d ln T/d ln nu of brightness temperature at the row's frequency, flux_index = index + "
            "2, "
            "electron_slope " +
            std::string(source_.has_own_slope ? "the electrons' own" : "= -3 - 2 index") +
            std::string(source_.has_curvature ? ", curvature half the second derivative" : ""));
    if (source_.polarized)
        lines.push_back(std::string("polarization in the ") +
                        (convention() == PolarizationConvention::Cosmo ? "COSMO" : "IAU") +
                        " convention, angle_deg = 0.5 atan2(U, Q)");
    if (options_.disc)
        lines.push_back("means over the pixels whose centres lie within " + to_text(*options_.disc) +
                        " of the position; scatter is the standard deviation of " +
                        (source_.has_brightness ? "brightness, index that of the mean brightness" : "index"));
    return lines;
}

bool Answer::answer(const PositionBatch& batch) {
    const std::size_t part = largest_part();
    for (std::size_t first = 0; first < batch.positions.size(); first += part)
        if (!write_part(batch, first, std::min(part, batch.positions.size() - first))) return false;
    return true;
}

std::size_t Answer::largest_part() const {
    std::size_t part = std::max<std::size_t>(1, most_rows / source_.columns.size());
    if (options_.disc) {
        const double share = 0.5 * (1 - std::cos(options_.disc->radians()));
        const double pixels = share * static_cast<double>(source_.grid.npix()) + 1;
        part = std::min(part, static_cast<std::size_t>(static_cast<double>(most_pixels) / pixels) + 1);
    }
    return part;
}

void Answer::find_pixels(const PositionBatch& batch, std::size_t first, std::size_t count) {
    own_pixels_.resize(count);
    centres_.resize(count);
    // A pixel of the source's own grid is taken by its number: its centre need not be looked up.
    const bool direct = !batch.pixels.empty() && pixel_grid_ == source_.grid && style_.frame == source_.frame;
    parallel_for_blocks(static_cast<std::int64_t>(count), block, [&](std::int64_t begin, std::int64_t end) {
        for (auto i = static_cast<std::size_t>(begin); i < static_cast<std::size_t>(end); ++i) {
            centres_[i] = direction_in_source(batch.positions[first + i]);
            own_pixels_[i] = direct ? batch.pixels[first + i] : source_.grid.pixel_at(centres_[i]);
        }
    });
}

void Answer::make_groups(const PositionBatch& batch, std::size_t first, std::size_t count) {
    find_pixels(batch, first, count);
    groups_ = {};
    if (!takes_groups()) {
        groups_.pixels = own_pixels_;
        return;
    }
    groups_.first.push_back(0);
    for (std::size_t i = 0; i < count; ++i) {
        if (options_.disc) {
            const auto disc = pixels_in_disc(source_.grid, centres_[i], *options_.disc);
            groups_.pixels.insert(groups_.pixels.end(), disc.begin(), disc.end());
        } else {
            const HealpixGrid::Stencil stencil = source_.grid.interpolation(centres_[i]);
            groups_.pixels.insert(groups_.pixels.end(), stencil.pixels.begin(), stencil.pixels.end());
            groups_.weights.insert(groups_.weights.end(), stencil.weights.begin(), stencil.weights.end());
        }
        groups_.first.push_back(groups_.pixels.size());
    }
}

// Q and U of a group are carried to its centre, then read against the rows' frame.
void Answer::make_turns() {
    const bool turns_frame = style_.frame != source_.frame;
    turns_.clear();
    if (!source_.polarized || (!turns_frame && !takes_groups())) return;
    turns_.resize(groups_.pixels.size());
    const auto turn_pixel = [&](std::size_t row, std::size_t i) {
        const Vector3 n = source_.grid.direction(groups_.pixels[i]);
        StokesTurn turn = takes_groups() ? turn_along_great_circle(n, centres_[row]) : StokesTurn{};
        if (turns_frame) {
            const StokesTurn second = turn_between_frames(takes_groups() ? centres_[row] : n, from_source_);
            turn = {turn.cosine * second.cosine - turn.sine * second.sine,
                    turn.cosine * second.sine + turn.sine * second.cosine};
        }
        turns_[i] = turn;
    };
    parallel_for_blocks(
        static_cast<std::int64_t>(groups_.rows()), takes_groups() ? 1 : block,
        [&](std::int64_t begin, std::int64_t end) {
            for (auto row = static_cast<std::size_t>(begin); row < static_cast<std::size_t>(end); ++row) {
                const std::size_t from = groups_.first.empty() ? row : groups_.first[row];
                const std::size_t to = groups_.first.empty() ? row + 1 : groups_.first[row + 1];
                for (std::size_t i = from; i < to; ++i)
                    turn_pixel(row, i);
            }
        });
}

bool Answer::write_part(const PositionBatch& batch, std::size_t first, std::size_t count) {
    make_groups(batch, first, count);
    make_turns();
    source_.load(groups_.pixels);
    RowBatch rows;
    rows.positions = std::span(batch.positions).subspan(first, count);
    rows.columns.reserve(source_.columns.size());
    for (std::size_t k = 0; k < source_.columns.size(); ++k) {
        PointValues values = source_.values(k);
        if (!turns_.empty()) turn_stokes(values, turns_);
        rows.columns.push_back(take_means(std::move(values), groups_));
    }
    if (options_.nested)
        for (std::int64_t& pixel : own_pixels_)
            pixel = source_.grid.ring_to_nested(pixel);
    rows.pixels = own_pixels_;
    for (const std::string& text : write_rows(style_, rows, !any_rows_))
        if (!write_(text)) return false;
    any_rows_ = any_rows_ || count > 0;
    return true;
}

}  // namespace

void run_at(const AtOptions& options, const std::function<bool(std::string_view)>& write,
            const std::function<void(const std::string&)>& note) {
    check_options(options);
    AtSource source = open_at_source(options);
    if (options.nside && !source.takes_nside && options.pixels.empty() && !options.positions_file)
        throw InputError("--nside is the grid of pixel numbers: give them with --pixel, or leave it out (" +
                         options.source + " has nside " + std::to_string(source.grid.nside()) + ")");
    const std::vector<std::string> notices = source.notices;
    Answer answer(options, std::move(source), write);
    answer.prepare();
    for (const std::string& line : answer.conventions())
        note(line);
    for (const std::string& line : notices)
        note(line);
    answer.run();
}

}  // namespace foreglow
