// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/command_line.h"

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cerrno>
#include <csignal>
#include <cstdio>
#include <cstring>
#include <new>

#include "base/build_info.h"
#include "base/error.h"
#include "base/interrupt.h"
#include "base/parallel.h"
#include "base/progress.h"
#include "base/text.h"
#include "jobs/at.h"
#include "jobs/draw.h"
#include "jobs/electrons.h"
#include "jobs/grade.h"
#include "jobs/index.h"
#include "jobs/make.h"
#include "jobs/models.h"
#include "jobs/start.h"
#include "jobs/study_request.h"

namespace foreglow {
namespace {

/// `at` with the options that are read as text first.
struct AtRequest {
    AtOptions options;
    std::string disc;
    std::optional<RowFormat> format;
};

struct CommonOptions {
    int threads = 0;
    bool quiet = false;
};

void say(const std::string& text) {
    std::fwrite(text.data(), 1, text.size(), stdout);
    std::fflush(stdout);
}

void note(const CommonOptions& common, const std::string& text) {
    if (!common.quiet) std::fprintf(stderr, "note: %s\n", text.c_str());
}

Progress make_progress(const CommonOptions& common) {
    return Progress(common.quiet ? Progress::Style::Quiet : Progress::style_of_stderr());
}

void add_common(CLI::App& command, CommonOptions& common) {
    command.add_option("--threads", common.threads, "how many threads to use (default: all processors)")
        ->check(CLI::Range(1, 1024));
    command.add_flag("--quiet", common.quiet, "nothing on standard error but errors");
}

// Options shared by make and plan.
void add_study_options(CLI::App& command, StudyRequest& request) {
    StudyOptions& study = request.options;
    command.add_option("STUDY", request.study,
                       "study file (TOML); `foreglow start` prints one to begin from");
    command.add_option("--out", request.out, "folder to write to (default: STUDY's stem + \"-out\" here)");
    command
        .add_option("--set", study.overrides,
                    "key=value, overrides a key of the study (dotted: channel.NAME.beam_fwhm=\"1 deg\")")
        ->take_all()
        ->expected(1)
        ->allow_extra_args(false);
    command.add_flag("--replace", request.replace,
                     "write into a folder that is not empty, replacing an earlier run");
    command.add_option("--realization", request.realization,
                       "make just this one of the study's realizations");
    command.add_option(
        "--cache", request.cache,
        "folder that keeps integrated maps of the built-in Galaxy (default: see foreglow models "
        "--cache)");
    command.add_flag("--no-cache", request.no_cache,
                     "neither take integrated maps from a cache nor keep them");
    const char* alone = "Without a study file";
    command.add_option("--model", study.model, "bundled model's name, or a model file")->group(alone);
    command.add_option("--frequency", study.frequencies, "such as \"70 GHz\"; repeat for more channels")
        ->take_all()
        ->expected(1)
        ->allow_extra_args(false)
        ->group(alone);
    command.add_option("--nside", study.nside, "a power of two from 1 to 8192")->group(alone);
    command.add_option("--stokes", study.stokes, "I or IQU")->group(alone);
    command.add_option("--unit", study.unit, "K_RJ, mK_RJ, uK_RJ, K_CMB, mK_CMB, uK_CMB, MJy/sr or Jy/pixel")
        ->group(alone);
    command.add_option("--bandwidth", study.bandwidth, "full width of every channel's flat response")
        ->group(alone);
    command
        .add_option("--beam-fwhm", study.beam_fwhm, "Gaussian beam of every channel, such as \"40 arcmin\"")
        ->group(alone);
    command.add_option("--title", study.title, "title of the study")->group(alone);
    command.add_option("--precision", study.precision, "float32 or float64")->group(alone);
    command.add_option("--frame", study.frame, "galactic, icrs or ecliptic")->group(alone);
    command.add_option("--ordering", study.ordering, "ring or nested")->group(alone);
    command.add_option("--polarization-convention", study.polarization_convention, "COSMO or IAU")
        ->group(alone);
    command.add_option("--monopole", study.monopole, "keep or remove")->group(alone);
    command.add_option("--coverage", study.coverage, "FITS map of the pixels to write")->group(alone);
    command.add_option("--lmax", study.lmax, "default 2 nside")->group(alone);
    command.add_option("--accuracy", study.accuracy, "default 1e-5")->group(alone);
    command.add_option("--seed", study.seed, "of the random parts")->group(alone);
    command.add_option("--realizations", study.realizations, "how many")->group(alone);
    command.add_option("--truth", study.truth, "false, true or full")->group(alone);
}

// An option that takes one of a few words.
template <class Value>
void add_choice(CLI::App& command, const std::string& name, std::optional<Value>& target,
                const std::vector<std::pair<std::string, Value>>& choices, const std::string& help) {
    std::string words;
    for (const auto& choice : choices)
        words += (words.empty() ? "" : ", ") + choice.first;
    const auto choose = [=, &target](const std::string& word) {
        for (const auto& choice : choices)
            if (choice.first == to_lower(word)) target = choice.second;
        if (!target) throw InputError(name + " " + word + ": use one of " + words);
    };
    command.add_option_function<std::string>(name, choose, words + "; " + help);
}

void add_index_options(CLI::App& command, IndexOptions& index) {
    command.add_option("SURVEYS", index.surveys, "surveys file (TOML)")->required();
    command.add_option("--out", index.out, "folder to write to (default: SURVEYS' stem + \"-out\" here)");
    const auto choose = [&index](const std::string& word) {
        if (to_lower(word) != "all" && to_lower(word) != "noise")
            throw InputError("--errors " + word + ": use one of all, noise");
        index.noise_errors_only = to_lower(word) == "noise";
    };
    command.add_option_function<std::string>(
        "--errors", choose,
        "all (default): noise, calibration and zero levels; noise: leaves the latter out");
    command.add_flag("--replace", index.replace,
                     "write into a folder that is not empty, replacing an earlier run");
}

void add_draw_options(CLI::App& command, DrawOptions& draw, std::vector<double>& center, std::string& size) {
    command.add_option("MAP", draw.map, "HEALPix FITS map")->required();
    add_choice<Frame>(command, "--frame", draw.frame,
                      {{"galactic", Frame::Galactic}, {"icrs", Frame::Icrs}, {"ecliptic", Frame::Ecliptic}},
                      "where the file does not say");
    add_choice<Ordering>(command, "--ordering", draw.ordering,
                         {{"ring", Ordering::Ring}, {"nested", Ordering::Nested}},
                         "where the file does not say");
    command.add_option("--column", draw.column, "number from 1, or name (default: the first)");
    command.add_option("--hdu", draw.hdu, "number of the table (default: the first HEALPix one)");
    command.add_option("--out", draw.output, "picture to write (default: MAP's stem + \".png\" here)");
    command.add_option("--title", draw.title, "above the picture");
    command.add_option("--unit", draw.unit, "unit to show, or that of a file that does not say");
    command.add_option("--center", center, "longitude and latitude of a close-up in degrees, LON,LAT")
        ->delimiter(',')
        ->expected(2);
    command.add_option("--size", size, "of the close-up, such as \"10 deg\"");
    command.add_option("--scale", draw.scale, "linear, log or signed");
    command.add_option("--low", draw.low, "lower end of the colours, in the unit shown");
    command.add_option("--high", draw.high, "upper end");
    command.add_option("--palette", draw.palette, "sequential, diverging or grey");
    command.add_option("--width", draw.width, "of the picture in pixels, 300 to 8000");
    command.add_flag("--replace", draw.replace, "replace a picture that exists");
}

constexpr const char* at_examples =
    R"(Examples:
  foreglow at disc-and-loops --position "120.5,-30" --frequency "70 MHz" --frequency "408 MHz"
      brightness, index, curvature and polarization at one galactic position, two rows
  foreglow at ridge-out --positions targets.csv --frame icrs --disc "1 deg" --format csv > rows.csv
      every channel of a finished run, averaged within 1 deg of each position of a table (ra,dec))";

void add_at_options(CLI::App& command, AtRequest& request) {
    AtOptions& at = request.options;
    command.footer(at_examples);
    command
        .add_option("SOURCE", at.source,
                    "a bundled model, a model file, a study, a finished run's folder, or an index map")
        ->required();
    command
        .add_option("--position", at.positions,
                    "\"LON,LAT\" in degrees, or in icrs hours and degrees \"05:34:31.9,+22:00:52\"; "
                    "repeatable")
        ->take_all()
        ->expected(1)
        ->allow_extra_args(false);
    command.add_option("--pixel", at.pixels, "pixel number on the grid of --nside; repeatable")
        ->take_all()
        ->expected(1)
        ->allow_extra_args(false);
    command.add_option("--positions", at.positions_file,
                       "CSV of any length with lon_deg,lat_deg or pixel; - is standard input");
    command.add_option("--nside", at.nside, "of pixel numbers, and the grid of a sky from formulas");
    command.add_flag("--nested", at.nested, "pixel numbers are NESTED (default: RING)");
    add_choice<Frame>(command, "--frame", at.frame,
                      {{"galactic", Frame::Galactic}, {"icrs", Frame::Icrs}, {"ecliptic", Frame::Ecliptic}},
                      "of positions, Q and U (default: galactic; with --pixel the source's)");
    command.add_option("--disc", request.disc,
                       "mean over the pixels within this radius of each position, such as \"2 deg\"");
    command.add_flag("--interpolate", at.interpolate,
                     "bilinear between the four nearest pixels (default: the pixel itself)");
    command
        .add_option("--frequency", at.frequencies,
                    "\"70 MHz\", or a log grid \"50 MHz:200 MHz:7\"; repeatable (default: a study's or run's "
                    "channels)")
        ->take_all()
        ->expected(1)
        ->allow_extra_args(false);
    command.add_option("--unit", at.unit,
                       "K_RJ, mK_RJ, uK_RJ, K_CMB, mK_CMB, uK_CMB, MJy/sr or Jy/pixel (default: K_RJ, or the "
                       "study's)");
    add_choice<PolarizationConvention>(
        command, "--polarization-convention", at.convention,
        {{"cosmo", PolarizationConvention::Cosmo}, {"iau", PolarizationConvention::Iau}},
        "sign of U and angle_deg (default: COSMO, or the study's)");
    command.add_option("--realization", at.realization, "of a run with several");
    add_choice<RowFormat>(command, "--format", request.format,
                          {{"table", RowFormat::Table}, {"csv", RowFormat::Csv}, {"json", RowFormat::Json}},
                          "how rows are written (default: table)");
    const char* index_map = "Of an index map";
    command.add_option("--column", at.column, "number from 1, or name (default: INDEX, else the first)")
        ->group(index_map);
    command.add_option("--hdu", at.hdu, "number of the table (default: the first HEALPix one)")
        ->group(index_map);
    add_choice<Frame>(command, "--map-frame", at.map_frame,
                      {{"galactic", Frame::Galactic}, {"icrs", Frame::Icrs}, {"ecliptic", Frame::Ecliptic}},
                      "where the file does not say");
    add_choice<Ordering>(command, "--map-ordering", at.map_ordering,
                         {{"ring", Ordering::Ring}, {"nested", Ordering::Nested}},
                         "where the file does not say");
}

void add_format(CLI::App& command, RowFormat& format) {
    const auto choose = [&format](const std::string& word) {
        const std::string lower = to_lower(word);
        if (lower != "table" && lower != "csv" && lower != "json")
            throw InputError("--format " + word + ": use one of table, csv, json");
        format = lower == "csv" ? RowFormat::Csv : lower == "json" ? RowFormat::Json : RowFormat::Table;
    };
    command.add_option_function<std::string>("--format", choose, "of the rows: table, csv or json");
}

constexpr const char* index_examples = R"(Examples:
  foreglow index surveys.toml --out index
      reads the surveys that the file names, and leaves index/index.fits, ready to be an
      [index] map, amplitude.fits, scatter.csv (the T-T estimate by cell) and run.json.
      surveys.toml:
          reference_frequency = "1 GHz"
          nside = 128
          beam_fwhm = "1 deg"
          [[survey]]
          map = "a.fits"
          frequency = "408 MHz"
          beam_fwhm = "51 arcmin"
          noise = "0.3 K_RJ"           # rms per pixel of the map as given, or noise_map
          calibration_error = 0.05
          zero_level = "3 K_RJ"        # subtracted
          zero_level_error = "1 K_RJ"
          [[survey]]
          map = "b.fits"
          ...
  foreglow index surveys.toml --errors noise --format csv > summary.csv
      the same values; errors of the noise alone, as wanted for the scatter between pixels.
index is beta of T ~ nu^beta (brightness temperature); errors are one sigma.)";

constexpr const char* grade_examples = R"(Examples:
  foreglow grade array-out --terms 4
      what remains of each channel of that run after the best smooth fit of 1, 2, 3, 4 terms
      in ln(nu) in every pixel: rows here, residual maps and spectra in array-out/grade.
      `foreglow grade array.toml` says the same of a study in seconds, on a coarse grid.
  foreglow grade array-out recovered/ --cut 0 --cut 30 --format csv
      recovered/NAME.fits minus the run's own map of channel NAME, by sky cut and band of l;
      recovered/index.fits is compared with the index of the beam-smoothed truth.
--terms amplitude+index+curvature is 3. rms, mean and p95 (of the absolute value) are in the
run's unit; rms_K_RJ is the same as Rayleigh-Jeans brightness temperature at the frequency.)";

void add_grade_options(CLI::App& command, GradeOptions& grade, std::string& beam) {
    command.add_option("SOURCE", grade.source, "a finished run's folder, or a study file")->required();
    command.add_option("RECOVERED", grade.recovered,
                       "recovered maps, or folders of them (default: the floor)");
    command.add_option("--terms", grade.terms,
                       "most terms of the smooth fit, or amplitude, amplitude+index, "
                       "amplitude+index+curvature (default: 3)");
    const auto choose = [&grade](const std::string& word) {
        if (to_lower(word) != "log" && to_lower(word) != "linear")
            throw InputError("--fit " + word + ": use one of log, linear");
        grade.linear = to_lower(word) == "linear";
    };
    command.add_option_function<std::string>("--fit", choose, "log (default) or linear: what is smooth");
    command.add_option("--tilt", grade.tilt, "index of the reference power law (default: -2.7)")
        ->check(CLI::Range(-10.0, 10.0));
    command.add_option("--mask", grade.mask, "FITS map: pixels that are defined and not zero count");
    command.add_option(
        "--common-beam", beam,
        "bring all channels to this FWHM first, such as \"2 deg\"; of recovered parameters the "
        "resolution");
    command.add_option("--nside", grade.nside, "grade on a coarser grid (a study: 64)");
    command.add_option("--cut", grade.cuts, "of recovered maps: |b| from this many degrees; repeatable")
        ->take_all()
        ->expected(1)
        ->allow_extra_args(false);
    command.add_option("--study", grade.study, "where a run's study file is, for its response tables");
    command.add_option("--realization", grade.realization, "of a run with several");
    command.add_option("--out", grade.out, "folder to write to (default: RUN/grade; of a study nothing)");
    command.add_flag("--replace", grade.replace, "replace an earlier grading");
}

constexpr const char* electrons_examples =
    R"(Examples:
  foreglow electrons --slope 2.5 --field "4 uG" --cutoff-energy "30 GeV" --frequency "45 MHz" --frequency "4.8 GHz"
      brightness against 408 MHz, index, curvature, polarization and energies at two frequencies
  foreglow electrons --index -2.7 --field "5 uG" --geometry tangled --aging isotropized --age "30 Myr" \
      --frequency "30 MHz:30 GHz:13" --format csv > aged.csv
      the electrons that have this index at 408 MHz, on a log grid of thirteen frequencies)";

void add_electrons_options(CLI::App& command, ElectronsOptions& electrons) {
    command.footer(electrons_examples);
    command.add_option("--slope", electrons.slope, "s of N(E) ~ E^-s below break and cut-off, positive");
    command.add_option("--index", electrons.index,
                       "or: of brightness temperature at --reference, T ~ nu^index");
    command.add_option("--flux-index", electrons.flux_index, "or: of flux there, S ~ nu^flux-index");
    command.add_option("--field", electrons.field,
                       "\"4 uG\": across the line of sight (ordered), or total (tangled)");
    ElectronRequest& request = electrons.request;
    add_choice<FieldGeometry>(command, "--geometry", request.geometry,
                              {{"ordered", FieldGeometry::Ordered}, {"tangled", FieldGeometry::Tangled}},
                              "default ordered");
    command.add_option("--break-energy", electrons.break_energy, "\"5 GeV\": where the slope rises");
    command.add_option("--break-step", request.break_step, "by so much (default 1)");
    command.add_option("--cutoff-energy", electrons.cutoff_energy, "\"30 GeV\": where the spectrum ends");
    const std::vector<std::pair<std::string, CutoffShape>> shapes{{"exponential", CutoffShape::Exponential},
                                                                  {"sharp", CutoffShape::Sharp}};
    add_choice<CutoffShape>(command, "--cutoff", request.cutoff, shapes, "default exponential");
    add_choice<AgingWord>(command, "--aging", request.aging,
                          {{"none", AgingWord::None},
                           {"continuous", AgingWord::Continuous},
                           {"isotropized", AgingWord::Isotropized},
                           {"fixed-pitch", AgingWord::FixedPitch}},
                          "losses to the field and the microwave background");
    command.add_option("--age", electrons.age, "\"50 Myr\"");
    add_choice<CutoffShape>(command, "--edge", request.edge, shapes, "of isotropized ageing, default sharp");
    command.add_option("--redshift", request.redshift, "frequencies are observed ones (default 0)");
    command.add_option("--reference", electrons.reference,
                       "where ratio is 1 and --index holds (default 408 MHz)");
    command
        .add_option("--frequency", electrons.frequencies,
                    "\"45 MHz\", or a log grid \"30 MHz:30 GHz:13\"; repeatable (default: the reference)")
        ->take_all()
        ->expected(1);
}

/// All that the command line can ask for.
struct Request {
    CommonOptions common;
    StudyRequest study;
    bool sha256 = false;
    StartRequest start;
    AtRequest at;
    ElectronsOptions electrons;
    std::string model_name;
    bool show_cache = false;
    bool clear_cache = false;
    DrawOptions draw;
    std::vector<double> draw_center;
    std::string draw_size;
    IndexOptions index;
    GradeOptions grade;
    std::string grade_beam;
};

void run_grade_command(Request& request) {
    if (!request.grade_beam.empty()) {
        try {
            request.grade.common_beam = parse_angle(request.grade_beam);
        } catch (const InputError& error) {
            throw InputError(std::string("--common-beam ") + error.what());
        }
        if (!(request.grade.common_beam->radians() > 0 && request.grade.common_beam->degrees() <= 180))
            throw InputError("--common-beam " + request.grade_beam +
                             ": give an angle above 0, up to 180 deg");
    }
    Progress progress = make_progress(request.common);
    say(run_grade(request.grade, progress).rows);
}

void run_draw_command(Request& request) {
    if (!request.draw_center.empty()) request.draw.center = {request.draw_center[0], request.draw_center[1]};
    if (!request.draw_size.empty()) {
        try {
            request.draw.size = parse_angle(request.draw_size);
        } catch (const InputError& error) {
            throw InputError(std::string("--size ") + error.what());
        }
    }
    const DrawResult result = run_draw(request.draw);
    for (const std::string& notice : result.notices)
        note(request.common, notice);
    say(result.picture.string() + "\n");
}

// Writes rows; false once their reader has closed the pipe.
bool write_rows_out(std::string_view text) {
    const bool written =
        std::fwrite(text.data(), 1, text.size(), stdout) == text.size() && std::fflush(stdout) == 0;
    if (!written && errno != EPIPE)
        throw FileError("standard output cannot be written: " + std::string(std::strerror(errno)));
    return written;
}

void run_at_command(Request& request) {
    AtOptions options = request.at.options;
    if (!request.at.disc.empty()) {
        try {
            options.disc = parse_angle(request.at.disc);
        } catch (const InputError& error) {
            throw InputError(std::string("--disc ") + error.what());
        }
    }
    options.format = request.at.format.value_or(RowFormat::Table);
    run_at(options, write_rows_out, [&](const std::string& line) { note(request.common, line); });
}

void run_models_command(const Request& request) {
    if (request.clear_cache)
        say(empty_cache());
    else if (request.show_cache)
        say(describe_cache());
    else
        say(request.model_name.empty() ? list_models() : print_model(request.model_name));
}

void run_start_command(const Request& request) {
    const StartResult result = run_start(request.start);
    for (const std::string& notice : result.notices)
        note(request.common, notice);
    if (!request.start.output) say(result.text);
    if (result.questions > 0)
        note(request.common, std::to_string(result.questions) +
                                 " questions are left open: look for the lines that begin with #?");
}

void define_commands(CLI::App& app, Request& request) {
    app.require_subcommand(1);
    app.set_version_flag("--version", "foreglow " + version());
    app.failure_message(CLI::FailureMessage::simple);

    CLI::App* make =
        app.add_subcommand("make", "makes the maps of a study: FITS maps, truth, report and manifest");
    add_study_options(*make, request.study);
    make->add_flag("--sha256", request.sha256, "put SHA-256 of the outputs into run.json besides XXH3-128");
    add_common(*make, request.common);
    make->callback([&request] {
        Progress progress = make_progress(request.common);
        say(run_make({make_plan_request(request.study), request.sha256}, progress).text);
    });

    CLI::App* plan =
        app.add_subcommand("plan", "checks a study without running it: files, memory, disk and time");
    add_study_options(*plan, request.study);
    add_common(*plan, request.common);
    plan->callback([&request] { say(describe_plan(make_plan(make_plan_request(request.study)))); });

    CLI::App* start = app.add_subcommand(
        "start", "prints a commented study to begin from, or a model for a downloaded map");
    start->add_option("OUTPUT", request.start.output, "file to write (default: standard output)");
    start->add_option("--model-for", request.start.model_for,
                      "a survey map: prints a model for it, with what its header leaves open");
    add_common(*start, request.common);
    start->callback([&request] { run_start_command(request); });

    CLI::App* models = app.add_subcommand("models", "lists the bundled models, or prints one");
    models->add_option("NAME", request.model_name, "the model to print");
    models->add_flag("--cache", request.show_cache,
                     "says where integrated maps of the built-in Galaxy are kept, and how much they take");
    models->add_flag("--clear-cache", request.clear_cache, "removes them");
    add_common(*models, request.common);
    models->callback([&request] { run_models_command(request); });

    CLI::App* draw = app.add_subcommand("draw", "draws a map: all sky, or a close-up");
    add_draw_options(*draw, request.draw, request.draw_center, request.draw_size);
    add_common(*draw, request.common);
    draw->callback([&request] { run_draw_command(request); });

    CLI::App* at = app.add_subcommand(
        "at", "answers at positions: brightness, index, curvature, polarization at any frequency");
    add_at_options(*at, request.at);
    add_common(*at, request.common);
    at->callback([&request] { run_at_command(request); });

    CLI::App* electrons = app.add_subcommand(
        "electrons", "works out a spectrum: index, curvature, polarization, energies and lifetimes");
    add_electrons_options(*electrons, request.electrons);
    add_format(*electrons, request.electrons.format);
    add_common(*electrons, request.common);
    electrons->callback([&request] { run_electrons(request.electrons, write_rows_out); });

    CLI::App* index = app.add_subcommand(
        "index", "makes a spectral-index map with its errors from survey maps at two or more frequencies");
    add_index_options(*index, request.index);
    add_format(*index, request.index.format);
    index->footer(index_examples);
    add_common(*index, request.common);
    index->callback([&request] {
        Progress progress = make_progress(request.common);
        say(run_index(request.index, progress).rows);
    });

    CLI::App* grade = app.add_subcommand(
        "grade", "scores what a subtraction recovered, or what a smooth fit would leave, against the truth");
    add_grade_options(*grade, request.grade, request.grade_beam);
    add_format(*grade, request.grade.format);
    grade->footer(grade_examples);
    add_common(*grade, request.common);
    grade->callback([&request] { run_grade_command(request); });

    for (CLI::App* command : {make, plan, start, at, electrons, index, grade, models, draw})
        command->parse_complete_callback([&request] {
            set_thread_count(request.common.threads > 0 ? request.common.threads : available_processors());
        });
}

int report(const std::string& message, int status) {
    std::fprintf(stderr, "foreglow: %s\n", message.c_str());
    return status;
}

// A word in the place of a command that is none; CLI11 would only say that one is missing.
void check_command(CLI::App& app, int argc, char** argv) {
    if (argc < 2 || argv[1][0] == '-') return;
    std::vector<std::string> names;
    for (const CLI::App* command : app.get_subcommands(nullptr))
        names.push_back(command->get_name());
    if (std::find(names.begin(), names.end(), argv[1]) != names.end()) return;
    const std::string nearest = nearest_word(argv[1], names);
    throw InputError(std::string("there is no command '") + argv[1] + "'" +
                     (nearest.empty() ? "" : "; did you mean '" + nearest + "'?") +
                     " (`foreglow --help` lists them)");
}

int run_guarded(CLI::App& app, int argc, char** argv) {
    try {
        check_command(app, argc, argv);
        app.parse(argc, argv);
        return 0;
    } catch (const CLI::Success& success) {  // help and version
        app.exit(success);
        return 0;
    } catch (const CLI::ParseError& error) {
        return report(std::string(error.what()) + " (`foreglow --help` lists what there is)", 2);
    } catch (const Error& error) {
        return report(error.what(), error.exit_status());
    } catch (const ContractError& error) {
        return report(std::string("a fault of the program itself, please report it: ") + error.what(), 1);
    } catch (const std::bad_alloc&) {
        return report("memory ran out: lower `nside` or `lmax`", 1);
    } catch (const std::exception& error) {
        return report(error.what(), 1);
    }
}

}  // namespace

int run_command_line(int argc, char** argv) {
    catch_interrupts();
    std::signal(SIGPIPE, SIG_IGN);  // a reader that has seen enough is no error
    CLI::App app("Makes simulated full-sky maps of the Galaxy's diffuse synchrotron emission.", "foreglow");
    Request request;
    define_commands(app, request);
    return run_guarded(app, argc, argv);
}

}  // namespace foreglow
