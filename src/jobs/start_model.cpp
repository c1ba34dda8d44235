// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <optional>
#include <string>

#include "base/quantity.h"
#include "base/text.h"
#include "io/text_file.h"
#include "io/toml_document.h"
#include "jobs/start.h"
#include "physics/brightness_unit.h"

namespace foreglow {
namespace {

constexpr std::size_t comment_column = 44;

/// Collects the lines of a model, with comments in one column, and counts the questions among them.
class ModelText {
  public:
    void add(const std::string& line, const std::string& comment = "") {
        text_ += line;
        if (!comment.empty())
            text_ += std::string(line.size() < comment_column ? comment_column - line.size() : 1, ' ') +
                     "# " + to_one_line(comment);
        text_ += "\n";
    }
    void ask(const std::string& line, const std::string& comment) {
        add("#? " + line, comment);
        ++questions_;
    }
    [[nodiscard]] const std::string& text() const { return text_; }
    [[nodiscard]] int questions() const { return questions_; }

  private:
    std::string text_;
    int questions_ = 0;
};

const FitsMapColumnInfo* find_column(const FitsMapHeader& header,
                                     std::initializer_list<const char*> beginnings) {
    for (const FitsMapColumnInfo& column : header.columns) {
        if (column.holds_pixel_numbers) continue;
        const std::string name = to_lower(column.name);
        for (const char* beginning : beginnings)
            if (name == beginning || name.starts_with(std::string(beginning) + "_") ||
                name.starts_with(std::string(beginning) + "-"))
                return &column;
    }
    return nullptr;
}

const FitsMapColumnInfo* find_intensity(const FitsMapHeader& header) {
    if (const auto* column = find_column(header, {"i", "temperature", "intensity", "t", "signal"}))
        return column;
    for (const FitsMapColumnInfo& column : header.columns)
        if (!column.holds_pixel_numbers) return &column;
    return nullptr;
}

void add_frequency(ModelText& model, const FitsMapHeader& header) {
    const std::optional<double> freq = header.number("FREQ");
    // Only from about a megahertz on can the number be nothing but hertz; 23 may be GHz, and 408 MHz.
    if (freq && *freq >= 1e6 && *freq <= 1e13) {
        model.add("reference_frequency = " + to_toml_string(to_text(Frequency::from_hz(*freq))),
                  "the header's FREQ, in Hz");
        return;
    }
    std::string found = "the header does not say";
    if (freq) found = "the header says FREQ = " + format_exact(*freq) + ", without a unit";
    if (const auto text = header.text("FREQ")) found = "the header says FREQ = '" + *text + "'";
    model.ask("reference_frequency = \"408 MHz\"", "at which frequency was this map made? " + found);
}

void add_layout(ModelText& model, const FitsMapHeader& header) {
    if (header.hdu != 1) model.add("hdu = " + std::to_string(header.hdu), "1 is the first extension");
    if (!header.ordering) model.ask("ordering = \"ring\"", "ring or nested? the header has no ORDERING");
    if (header.frame)
        model.add("# frame: " + to_text(*header.frame), "the header's COORDSYS");
    else
        model.ask("frame = \"galactic\"",
                  "galactic, icrs (equatorial) or ecliptic? the header has no COORDSYS we know");
}

void add_unit(ModelText& model, const FitsMapColumnInfo& column) {
    if (find_brightness_unit(column.unit)) {
        model.add("# unit: " + column.unit, "the header's TUNIT" + std::to_string(column.number));
        return;
    }
    const std::string found = column.unit.empty() ? "the header has no TUNIT" + std::to_string(column.number)
                                                  : "the header says '" + column.unit + "'";
    std::string guess = "K_RJ";
    for (const char* bare : {"K", "mK", "uK"})
        if (column.unit == bare) guess = std::string(bare) + "_RJ";
    model.ask("unit = " + to_toml_string(guess),
              "which unit? " + found + "; one of " + list_of_brightness_units());
}

void add_beam(ModelText& model, const FitsMapHeader& header) {
    const std::optional<double> fwhm = header.number("BEAMFWHM");
    if (fwhm && *fwhm > 0 && *fwhm <= 180)
        model.add("# beam_fwhm = " + to_toml_string(to_text(Angle::from_degrees(*fwhm))),
                  "the survey's own resolution: the header's BEAMFWHM, if that is in degrees");
    else
        model.add("# beam_fwhm = \"56 arcmin\"", "the survey's own resolution, if you know it");
}

void add_intensity(ModelText& model, const FitsMapHeader& header, const FitsMapColumnInfo& column,
                   const std::string& map) {
    model.add("");
    model.add("[intensity]");
    model.add("map = " + map);
    model.add("column = " + std::to_string(column.number), column.name);
    add_layout(model, header);
    add_unit(model, column);
    add_beam(model, header);
    model.add("# zero_level = \"8.9 K_RJ\"", "subtracted first: the CMB, extragalactic background, offset");
}

void add_polarization(ModelText& model, const FitsMapHeader& header, const FitsMapColumnInfo& q,
                      const FitsMapColumnInfo& u, const std::string& map) {
    model.add("");
    model.add("[polarization]");
    model.add("map = " + map,
              "what is open here but answered above is taken from there: it is the same file");
    model.add("columns = [" + std::to_string(q.number) + ", " + std::to_string(u.number) + "]",
              q.name + ", " + u.name);
    if (header.convention)
        model.add(std::string("# polarization_convention: ") +
                      (*header.convention == PolarizationConvention::Cosmo ? "COSMO" : "IAU"),
                  "the header's POLCCONV");
    else
        model.ask("polarization_convention = \"COSMO\"",
                  "COSMO (HEALPix) or IAU? the header has no POLCCONV; they differ in the sign of U");
    model.add("# index = -3.1", "an index of its own; else Q and U follow the intensity");
}

}  // namespace

StartResult make_start_model(const FitsMapHeader& header, const std::filesystem::path& map) {
    const std::string map_text = to_toml_string(map.string());
    ModelText body;
    body.add("title = " +
             to_toml_string(map.extension() == ".gz" ? map.stem().stem().string() : map.stem().string()));
    add_frequency(body, header);
    if (const FitsMapColumnInfo* intensity = find_intensity(header))
        add_intensity(body, header, *intensity, map_text);
    const FitsMapColumnInfo* q = find_column(header, {"q"});
    const FitsMapColumnInfo* u = find_column(header, {"u"});
    if (q != nullptr && u != nullptr) add_polarization(body, header, *q, *u, map_text);
    body.add("");
    body.add("[index]");
    body.add("value = -2.9", "ASSUMED, T ~ nu^value: no header says it; or map = \"index.fits\"");
    body.add("# frequency = \"1 GHz\"", "where it holds, if not at the reference frequency");
    body.add("");
    body.add("# [curvature]");
    body.add("# value = -0.04", "c of T ~ (nu/nu0)^(index + c ln(nu/nu0)); without it 0");

    StartResult result;
    result.questions = body.questions();
    result.notices = header.notices;
    result.text = "# A model for " + to_one_line(map.filename().string()) + " (nside " +
                  std::to_string(header.grid.nside()) + "), made from the map's header.\n";
    if (result.questions > 0)
        result.text +=
            "# What the header leaves open is a line that begins with \"#?\": take the #? away and correct "
            "the value.\n"
            "# Open questions: " +
            std::to_string(result.questions) + "\n";
    for (const std::string& notice : header.notices)
        result.text += "# Note: " + to_one_line(notice) + "\n";
    result.text += body.text();
    return result;
}

}  // namespace foreglow
