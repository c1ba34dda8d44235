// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/model_file.h"

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "io/toml_reader.h"
#include "model/bundled_models.h"
#include "model/detail_section.h"
#include "model/electrons_section.h"
#include "model/galaxy_section.h"
#include "model/model_sections.h"
#include "model/typed_keys.h"

namespace foreglow {
namespace {

/// Lets [polarization] take from [intensity] what it leaves open where both are columns of one file.
void add_shared_map_keys(ModelSpec& model) {
    if (!model.intensity || !model.polarization || !model.polarization->map) return;
    const MapSource& from = model.intensity->map;
    MapSource& to = *model.polarization->map;
    if (from.path != to.path) return;
    if (!to.hdu) to.hdu = from.hdu;
    if (!to.ordering) to.ordering = from.ordering;
    if (!to.frame) to.frame = from.frame;
    if (!to.unit) to.unit = from.unit;
    if (!to.convention) to.convention = from.convention;
}

/// Warns of an index that looks like one of flux: synchrotron has T indices near -2.5 to -3.1, flux -0.5 to
/// -1.1 (common practice).
void add_index_warning(ModelSpec& model) {
    const double* value = std::get_if<double>(&model.index.value);
    if (value == nullptr || !(*value > -1.5)) return;
    model.warnings.push_back(
        "the model's index = " + format_exact(*value) +
        " is taken as one of brightness temperature (T ~ nu^index, usually -2.5 to -3.1); if it is a flux "
        "index, write index = " +
        format_exact(*value - 2));
}

struct Sections {
    std::optional<TomlReader> sketch, galaxy, intensity, polarization, index, curvature, detail, electrons;
};

/// Refuses what the electrons themselves bring.
void check_electrons(TomlReader& top, Sections& sections, ModelSpec& model) {
    if (sections.curvature)
        top.fail("curvature", "contradicts [electrons], whose spectrum brings its own: keep one of the two");
    const bool tangled = model.electrons->law.geometry == FieldGeometry::Tangled;
    if (tangled && sections.polarization)
        top.fail(
            "polarization",
            "contradicts geometry = \"tangled\" in [electrons], a field of all directions that leaves no "
            "polarization: take one of the two out");
    if (!model.sketch) return;
    for (const char* key : {"curvature", "curvature_rms"})
        if (sections.sketch->has(key))
            sections.sketch->fail(key, "contradicts [electrons], whose spectrum brings its own: take it out");
    model.sketch->curvature = 0;
    model.sketch->curvature_rms = 0;
}

void check_sections(TomlReader& top, const Sections& sections) {
    if (sections.sketch && sections.galaxy)
        top.fail("galaxy", "contradicts [sketch]: a model is one sky, keep one of the two");
    if (sections.sketch || sections.galaxy) {
        const std::string whole = sections.sketch ? "[sketch]" : "[galaxy]";
        for (const auto& [other, name] : {std::pair(&sections.intensity, "intensity"),
                                          {&sections.polarization, "polarization"},
                                          {&sections.index, "index"},
                                          {&sections.curvature, "curvature"}})
            if (*other)
                top.fail(name, "contradicts " + whole + ", which brings its own: keep one of the two");
        if (sections.galaxy && sections.electrons)
            top.fail("electrons",
                     "contradicts [galaxy], which has electrons of its own: keep one of the two");
        return;
    }
    if (!sections.intensity)
        top.fail_here(
            "the section [intensity] is missing: add it with map = \"survey.fits\" (or [galaxy] for the "
            "built-in Galaxy)");
    if (!sections.index)
        top.fail_here("the section [index] is missing: add it with value = -2.9 or map = \"index.fits\"");
}

/// Refuses a detail that does not know where the template ends.
void check_detail(const TomlReader& reader, const ModelSpec& model) {
    const auto check_beam = [&](const std::optional<Angle>& beam, const std::string& section) {
        if (!beam)
            reader.fail_here("[detail] begins where the template's own beam ends, so it needs [" + section +
                             "] beam_fwhm = \"56 arcmin\" (the survey's resolution)");
        if (model.detail->envelope_fwhm < *beam)
            reader.fail("envelope_fwhm", "must be at least the beam of [" + section + "], " + to_text(*beam) +
                                             ", but is " + to_text(model.detail->envelope_fwhm) +
                                             ": the brightness that modulates is smoother than the template");
    };
    if (model.intensity) check_beam(model.intensity->beam_fwhm, "intensity");
    if (model.polarization && model.polarization->map)
        check_beam(model.polarization->beam_fwhm, "polarization");
    if (!model.intensity && !model.sketch)
        reader.fail_here("[detail] needs a template with a beam: an [intensity] section");
}

void check_scatter_correlation(const ModelSpec& model, Sections& sections) {
    if (model.detail) return;
    if (model.index.scatter && model.index.scatter->correlation != 0)
        sections.index->fail("scatter_correlation",
                             "is one with the intensity's detail, but there is no [detail]: add one, or take "
                             "it out");
    if (model.curvature_scatter && model.curvature_scatter->correlation != 0)
        sections.curvature->fail("scatter_correlation",
                                 "is one with the intensity's detail, but there is no [detail]: add one, or "
                                 "take it out");
}

}  // namespace

ModelSpec make_model(const std::string& text, const std::filesystem::path& file, const std::string& name) {
    const TomlValue document = parse_toml(text, file.empty() ? name : file.string());
    const std::filesystem::path folder = file.parent_path();
    TomlReader top(document);
    ModelSpec model;
    model.file = file;
    model.name = name;
    model.source = text;
    model.title = top.text("title", "title = \"Survey at 408 MHz\"").value_or(name);
    const std::optional<Frequency> reference = read_frequency(top, "reference_frequency");
    Sections sections{top.table("sketch"),       top.table("galaxy"),   top.table("intensity"),
                      top.table("polarization"), top.table("index"),    top.table("curvature"),
                      top.table("detail"),       top.table("electrons")};
    refuse_for_now(top, "faraday");
    top.check_no_other_keys();
    if (!reference) top.fail_missing("reference_frequency", "reference_frequency = \"408 MHz\"");
    model.reference_frequency = *reference;
    check_sections(top, sections);
    if (sections.sketch) model.sketch = read_sketch(*sections.sketch);
    if (sections.galaxy) model.galaxy = read_galaxy(*sections.galaxy);
    if (sections.intensity) model.intensity = read_intensity(*sections.intensity, folder);
    if (sections.polarization) model.polarization = read_polarization(*sections.polarization, folder);
    if (sections.index) model.index = read_index(*sections.index, folder);
    if (sections.curvature)
        model.curvature = read_curvature(*sections.curvature, folder, model.curvature_scatter);
    if (sections.electrons) {
        model.electrons = read_electrons(*sections.electrons, folder);
        check_electrons(top, sections, model);
    }
    if (sections.detail) {
        model.detail = read_detail(*sections.detail, folder);
        check_detail(*sections.detail, model);
    }
    check_scatter_correlation(model, sections);
    add_shared_map_keys(model);
    add_index_warning(model);
    return model;
}

ModelSpec read_model(const std::filesystem::path& path) {
    return make_model(read_text_file(path, "model file"), path, path.stem().string());
}

ModelSpec read_bundled_model(const std::string& name) {
    const BundledModel* bundled = find_bundled_model(name);
    if (bundled == nullptr) {
        const std::vector<std::string> names = list_bundled_names();
        const std::string nearest = nearest_word(name, names);
        std::string list;
        for (const std::string& one : names)
            list += (list.empty() ? "" : ", ") + one;
        throw InputError(
            to_one_line("there is no bundled model '" + name +
                        "': " + (nearest.empty() ? "there are " + list : "did you mean '" + nearest + "'?")));
    }
    return make_model(std::string(bundled->text), {}, name);
}

}  // namespace foreglow
