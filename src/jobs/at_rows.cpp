// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/at_rows.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <string_view>

#include "base/constants.h"
#include "base/parallel.h"
#include "physics/spectral_law.h"

namespace foreglow {
namespace {

constexpr std::int64_t rows_of_a_task = 2048;
constexpr int table_width = 13;
constexpr int table_digits = 7;
constexpr double missing = std::numeric_limits<double>::quiet_NaN();

/// The numbers of one row, in the order of the keys.
struct Row {
    double frequency = missing, brightness = missing;
    double index = missing, curvature = missing, index_reference = missing, slope = missing;
    double q = missing, u = missing;
    double scatter = missing;
    std::int64_t defined = 0;

    [[nodiscard]] double flux() const { return flux_index(index); }
    [[nodiscard]] double polarized() const { return std::hypot(q, u); }
    [[nodiscard]] double fraction() const { return brightness > 0 ? polarized() / brightness : missing; }
    [[nodiscard]] double angle() const { return 0.5 * std::atan2(u, q) * 180 / constants::pi; }
};

double value_of(const std::vector<double>& column, std::size_t row) {
    return column.empty() ? missing : column[row];
}

Row make_row(const GroupedValues& grouped, const AtColumn& column, std::size_t row, bool negate_u) {
    const PointValues& values = grouped.values;
    Row out;
    if (column.frequency) out.frequency = column.frequency->hz();
    out.brightness = value_of(values.brightness, row);
    out.index = value_of(values.index, row);
    out.curvature = value_of(values.curvature, row);
    out.index_reference = value_of(values.index_reference, row);
    out.slope = value_of(values.electron_slope, row);
    out.q = value_of(values.q, row);
    out.u = value_of(values.u, row);
    if (negate_u) out.u = 0.0 - out.u;
    if (!grouped.defined.empty()) {
        out.scatter = grouped.scatter[row];
        out.defined = grouped.defined[row];
    }
    return out;
}

/// Appends the fields of a row to a text in one of the three formats.
class RowWriter {
  public:
    RowWriter(const RowStyle& style, std::string& out) : style_(style), out_(out) {}

    void begin(bool is_first) {
        first_field_ = true;
        if (style_.format == RowFormat::Json) out_ += is_first ? "\n  {" : ",\n  {";
    }
    void end() { out_ += style_.format == RowFormat::Json ? "}" : "\n"; }

    void number(const char* key, double value) {
        std::array<char, 40> text{};
        char* const begin_text = text.data();
        char* const end_text = begin_text + text.size();
        if (!std::isfinite(value)) return put(key, style_.format == RowFormat::Csv ? "" : no_value());
        const auto result =
            style_.format == RowFormat::Table
                ? std::to_chars(begin_text, end_text, value, std::chars_format::general, table_digits)
                : std::to_chars(begin_text, end_text, value);
        put(key, {begin_text, static_cast<std::size_t>(result.ptr - begin_text)});
    }
    void whole(const char* key, std::int64_t value) {
        std::array<char, 24> text{};
        const auto result = std::to_chars(text.data(), text.data() + text.size(), value);
        put(key, {text.data(), static_cast<std::size_t>(result.ptr - text.data())});
    }
    /// @param value  plain letters; none is null
    void word(const char* key, std::string_view value) {
        if (value.empty()) return put(key, style_.format == RowFormat::Csv ? "" : no_value());
        if (style_.format != RowFormat::Json) return put(key, value);
        out_ += first_field_ ? "\"" : ", \"";
        first_field_ = false;
        out_ += key;
        out_ += "\": \"";
        out_ += value;
        out_ += '"';
    }

  private:
    [[nodiscard]] std::string_view no_value() const {
        return style_.format == RowFormat::Json ? "null" : "-";
    }
    void put(const char* key, std::string_view value) {
        if (style_.format == RowFormat::Table) {
            const auto width = static_cast<std::size_t>(table_width);
            if (!first_field_) out_ += ' ';
            out_.append(value.size() < width ? width - value.size() : 0, ' ');
        } else if (style_.format == RowFormat::Csv) {
            if (!first_field_) out_ += ',';
        } else {
            out_ += first_field_ ? "\"" : ", \"";
            out_ += key;
            out_ += "\": ";
        }
        first_field_ = false;
        out_ += value;
    }

    const RowStyle& style_;
    std::string& out_;
    bool first_field_ = true;
};

/// Calls the writer for each field of a row; the one place that knows their order. A table leaves out what is
/// the same in all rows (the heading and the notes say it) and what the source has none of.
template <class Writer>
void write_fields(const RowStyle& style, const SkyPosition& position, std::int64_t pixel,
                  const AtColumn& column, const Row& row, Writer& writer) {
    const bool all = style.format != RowFormat::Table;
    writer.number("lon_deg", position.lon_deg);
    writer.number("lat_deg", position.lat_deg);
    if (all) writer.word("frame", to_text(style.frame));
    if (all) writer.whole("nside", style.nside);
    writer.whole("pixel", pixel);
    writer.number("frequency_Hz", row.frequency);
    if (all || style.has_brightness) writer.number("brightness", row.brightness);
    if (all) writer.word("unit", column.unit);
    writer.number("index", row.index);
    writer.number("curvature", row.curvature);
    writer.number("index_reference", row.index_reference);
    writer.number("flux_index", row.flux());
    writer.number("electron_slope", row.slope);
    if (all) writer.number("Q", row.q);
    if (all) writer.number("U", row.u);
    if (all || style.polarized) {
        writer.number("polarized_brightness", row.polarized());
        writer.number("polarized_fraction", row.fraction());
        writer.number("angle_deg", row.angle());
    }
    if (style.with_disc) {
        writer.whole("pixels", row.defined);
        writer.number("scatter", row.scatter);
    }
    if (style.with_channel) writer.word("channel", column.channel);
}

/// Takes the keys where RowWriter takes the values; of a table also their units, which make a second line.
struct KeyWriter {
    const RowStyle& style;
    std::string keys, units;

    void add(std::string_view key) {
        if (style.format != RowFormat::Table) {
            keys += keys.empty() ? "" : ",";
            keys += key;
            return;
        }
        append(keys, short_key(key));
        append(units, unit_of(key));
    }
    void number(const char* key, double) { add(key); }
    void whole(const char* key, std::int64_t) { add(key); }
    void word(const char* key, std::string_view) { add(key); }

  private:
    static void append(std::string& line, std::string_view text) {
        const auto width = static_cast<std::size_t>(table_width);
        if (!line.empty()) line += ' ';
        line.append(text.size() < width ? width - text.size() : 0, ' ');
        line += text;
    }
    // A table's columns are narrower than the longest keys.
    static std::string_view short_key(std::string_view key) {
        if (key == "index_reference") return "index_ref";
        if (key == "electron_slope") return "slope";
        if (key == "polarized_brightness") return "P";
        if (key == "polarized_fraction") return "P/I";
        return key;
    }
    [[nodiscard]] std::string_view unit_of(std::string_view key) const {
        if (key == "lon_deg" || key == "lat_deg") return to_text_of(style.frame);
        if (key == "brightness" || key == "polarized_brightness") return style.columns.front().unit;
        if (key == "scatter" && style.has_brightness) return style.columns.front().unit;
        if (key == "angle_deg") return style.negate_u ? "IAU" : "COSMO";
        return "";
    }
    static std::string_view to_text_of(Frame frame) {
        return frame == Frame::Galactic ? "galactic" : frame == Frame::Icrs ? "icrs" : "ecliptic";
    }
};

}  // namespace

std::string write_row_heading(const RowStyle& style) {
    if (style.format == RowFormat::Json) return "[";
    KeyWriter writer{style, "", ""};
    write_fields(style, {}, 0, {}, {}, writer);
    return writer.keys + "\n" + (style.format == RowFormat::Table ? writer.units + "\n" : "");
}

std::vector<std::string> write_rows(const RowStyle& style, const RowBatch& batch, bool is_first) {
    const auto columns = static_cast<std::int64_t>(style.columns.size());
    const auto positions = static_cast<std::int64_t>(batch.positions.size());
    const std::int64_t block = std::max<std::int64_t>(1, rows_of_a_task / columns);
    std::vector<std::string> texts(static_cast<std::size_t>((positions + block - 1) / block));
    parallel_for_blocks(positions, block, [&](std::int64_t begin, std::int64_t end) {
        std::string& text = texts[static_cast<std::size_t>(begin / block)];
        text.reserve(static_cast<std::size_t>((end - begin) * columns * 420));
        RowWriter writer(style, text);
        for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p)
            for (std::size_t k = 0; k < style.columns.size(); ++k) {
                writer.begin(is_first && p == 0 && k == 0);
                write_fields(style, batch.positions[p], batch.pixels[p], style.columns[k],
                             make_row(batch.columns[k], style.columns[k], p, style.negate_u), writer);
                writer.end();
            }
    });
    return texts;
}

std::string write_row_ending(const RowStyle& style, bool any_rows) {
    if (style.format != RowFormat::Json) return "";
    return any_rows ? "\n]\n" : "]\n";
}

}  // namespace foreglow
