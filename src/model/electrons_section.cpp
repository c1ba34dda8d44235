// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/electrons_section.h"

#include "base/error.h"
#include "model/electron_request.h"
#include "model/model_sections.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

std::optional<double> read_quantity(TomlReader& reader, const std::string& key, const std::string& example,
                                    double (*parse)(std::string_view)) {
    const auto text = reader.text(key, key + " = \"" + example + "\"");
    if (!text) return std::nullopt;
    try {
        return parse(*text);
    } catch (const InputError& error) {
        reader.fail(key, error.what());
    }
}

}  // namespace

ElectronsSpec read_electrons(TomlReader reader, const std::filesystem::path& folder) {
    ElectronsSpec electrons;
    ElectronRequest request;
    request.field_uG = read_quantity(reader, "field", "5 uG", parse_field_ug);
    electrons.field_map = read_named_map(reader, "field_map", "electrons", folder);
    request.geometry = read_choice<FieldGeometry>(
        reader, "geometry", {{"ordered", FieldGeometry::Ordered}, {"tangled", FieldGeometry::Tangled}});
    request.break_GeV = read_quantity(reader, "break_energy", "10 GeV", parse_energy_gev);
    electrons.break_energy_map = read_named_map(reader, "break_energy_map", "electrons", folder);
    request.break_step = read_number(reader, "break_step", 0, 5, "break_step = 1.0");
    request.cutoff_GeV = read_quantity(reader, "cutoff_energy", "2 TeV", parse_energy_gev);
    electrons.cutoff_energy_map = read_named_map(reader, "cutoff_energy_map", "electrons", folder);
    const auto read_shape = [&](const char* key) {
        return read_choice<CutoffShape>(
            reader, key, {{"exponential", CutoffShape::Exponential}, {"sharp", CutoffShape::Sharp}});
    };
    request.cutoff = read_shape("cutoff");
    request.edge = read_shape("edge");
    request.aging = read_choice<AgingWord>(reader, "aging",
                                           {{"none", AgingWord::None},
                                            {"continuous", AgingWord::Continuous},
                                            {"isotropized", AgingWord::Isotropized},
                                            {"fixed-pitch", AgingWord::FixedPitch}});
    request.age_Myr = read_quantity(reader, "age", "50 Myr", parse_time_myr);
    request.redshift = read_number(reader, "redshift", 0, 20, "redshift = 0.0");
    reader.check_no_other_keys();
    request.has_field_map = electrons.field_map.has_value();
    request.has_break_map = electrons.break_energy_map.has_value();
    request.has_cutoff_map = electrons.cutoff_energy_map.has_value();
    electrons.law = make_electron_law(request, [&reader](const std::string& key, const std::string& message) {
        reader.fail(key, message);
    });
    return electrons;
}

}  // namespace foreglow
