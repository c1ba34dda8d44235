#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Maps of models with [electrons] against tests/oracle/electron_oracle.py: all laws, break, cut-off and ageing together.

Tolerance: 1e-5 of each pixel, 30 MHz to 400 GHz; the oracle's own error is below 1e-6.
"""

import json

import healpy
import numpy

import harness  # which knows where the oracles are

import electron_oracle

NU0 = 408e6
FREQUENCIES = [30e6, 150e6, 1.42e9, 30e9, 400e9]
TOLERANCE = 1e-5
STUDY = """model = "model.toml"
nside = 1
stokes = "{stokes}"
precision = "float64"
accuracy = 1e-6
truth = true
""" + "".join(f'[[channel]]\nname = "c{i}"\nfrequency = "{f:.0f} Hz"\n' for i, f in enumerate(FREQUENCIES))
MODEL = """reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
{polarization}
[index]
map = "index.fits"
{index}
[electrons]
{electrons}
"""
POLARIZATION = """[polarization]
map = "sky.fits"
columns = [2, 3]
reference_frequency = "22.8 GHz"
"""
BREAK = {"break_energy": 4.0, "break_step": 0.6}
CUTOFF = {"cutoff_energy": 90.0}
# Each law by itself, and break, cut-off and ageing together.
LAWS = {
    "plain": {},
    "broken": BREAK,
    "exponential": CUTOFF,
    "sharp": {"cutoff_energy": 60.0, "cutoff": "sharp"},
    "all but age": {**BREAK, **CUTOFF, "tangled": True},
    "isotropized": {"aging": "isotropized", "age": 12.0},
    "isotropized edge": {"aging": "isotropized", "age": 12.0, "edge": "exponential", **BREAK},
    "isotropized all": {"aging": "isotropized", "age": 12.0, **BREAK, **CUTOFF, "redshift": 0.3},
    "isotropized sharp": {"aging": "isotropized", "age": 12.0, "tangled": True, **BREAK, "cutoff_energy": 60.0,
                          "cutoff": "sharp"},
    "continuous": {"aging": "continuous", "age": 60.0},
    "continuous all": {"aging": "continuous", "age": 60.0, **BREAK, **CUTOFF},
    "fixed": {"aging": "fixed-pitch", "age": 12.0, **BREAK},
    "fixed tangled": {"aging": "fixed-pitch", "age": 12.0, "tangled": True},
    "fixed all": {"aging": "fixed-pitch", "age": 12.0, "tangled": True, **BREAK, **CUTOFF},
}
UNITS = {"field": "uG", "break_energy": "GeV", "cutoff_energy": "GeV", "age": "Myr"}


def keys(law):
    """Returns the lines of [electrons]."""
    lines = [f'geometry = "{"tangled" if law.get("tangled") else "ordered"}"']
    for key, value in law.items():
        if key in UNITS:
            lines.append(f'{key} = "{value} {UNITS[key]}"')
        elif key in ("break_step", "redshift"):
            lines.append(f"{key} = {value}")
        elif key != "tangled":
            lines.append(f'{key} = "{value}"')
    return "\n".join(lines)


class Electrons(harness.Case):
    def make(self, law, polarized=False, index="", extra="", indices=None):
        random = numpy.random.default_rng(5)
        self.sky = numpy.array([random.uniform(5, 50, 12), random.uniform(-2, 2, 12), random.uniform(-2, 2, 12)])
        self.indices = numpy.linspace(-3.0, -2.6, 12) if indices is None else indices
        self.write_map("sky.fits", self.sky, unit="K_RJ", convention="COSMO")
        self.write_map("index.fits", self.indices, names=["INDEX"])
        self.write("model.toml", MODEL.format(polarization=POLARIZATION if polarized else "", index=index,
                                              electrons=keys(law) + "\n" + extra))
        self.write("study.toml", STUDY.format(stokes="IQU" if polarized else "I"))
        self.foreglow("make", "study.toml", "--replace")
        return [numpy.atleast_2d(healpy.read_map(self.folder / f"study-out/maps/c{i}.fits", field=None, dtype=float))
                for i in range(len(FREQUENCIES))]

    def test_every_law_and_their_combinations(self):
        for name, law in LAWS.items():
            with self.subTest(name):
                oracle = electron_oracle.Law(4.0, **law)
                maps = self.make({"field": 4.0, **law})
                for pixel in (0, 11):
                    slope = oracle.slope(self.indices[pixel], NU0)
                    expected = self.sky[0, pixel] * oracle.ratio(slope, FREQUENCIES, NU0)
                    found = numpy.array([m[0, pixel] for m in maps])
                    numpy.testing.assert_allclose(found, expected, rtol=TOLERANCE)

    def test_polarization_follows_the_polarized_emissivity(self):
        for name in ("exponential", "isotropized all"):
            law = LAWS[name]
            oracle = electron_oracle.Law(4.0, **law)
            maps = self.make({"field": 4.0, **law}, polarized=True)
            for pixel in (0, 11):
                slope = oracle.slope(self.indices[pixel], NU0)
                ratio = oracle.ratio(slope, FREQUENCIES, 22.8e9, polarized=True)
                for stokes in (1, 2):
                    found = numpy.array([m[stokes, pixel] for m in maps])
                    numpy.testing.assert_allclose(found, self.sky[stokes, pixel] * ratio, rtol=TOLERANCE)

    def test_chord_and_other_frequency_of_the_index(self):
        law = LAWS["all but age"]
        oracle = electron_oracle.Law(4.0, **law)
        for line, where in (('between = ["408 MHz", "23 GHz"]', (408e6, 23e9)), ('frequency = "1 GHz"', (1e9, None))):
            maps = self.make({"field": 4.0, **law}, index=line)
            slope = oracle.slope(self.indices[7], *where)
            expected = self.sky[0, 7] * oracle.ratio(slope, FREQUENCIES, NU0)
            numpy.testing.assert_allclose([m[0, 7] for m in maps], expected, rtol=TOLERANCE)
            truth = healpy.read_map(self.folder / "study-out/truth/index.fits", dtype=float)
            self.assertAlmostEqual(truth[7], oracle.index(slope, NU0), delta=1e-6)  # the oracle's difference

    def test_maps_of_field_and_energies(self):
        field = numpy.linspace(2, 7, 12)
        cutoff = numpy.linspace(150, 60, 12)
        self.write_map("field.fits", field, names=["FIELD"])
        self.write_map("cutoff.fits", cutoff, names=["ENERGY"])
        maps = self.make({"break_energy": 4.0}, extra='field_map = "field.fits"\ncutoff_energy_map = "cutoff.fits"\n')
        for pixel in (0, 4, 11):
            oracle = electron_oracle.Law(field[pixel], break_energy=4.0, cutoff_energy=cutoff[pixel])
            slope = oracle.slope(self.indices[pixel], NU0)
            expected = self.sky[0, pixel] * oracle.ratio(slope, FREQUENCIES, NU0)
            numpy.testing.assert_allclose([m[0, pixel] for m in maps], expected, rtol=TOLERANCE)

    def test_truth_holds_local_index_and_curvature(self):
        law = LAWS["isotropized all"]
        oracle = electron_oracle.Law(4.0, **law)
        self.make({"field": 4.0, **law})
        truth = healpy.read_map(self.folder / "study-out/truth/index.fits", dtype=float)
        numpy.testing.assert_allclose(truth, self.indices, atol=1e-7)  # it was given at nu0
        curvature = healpy.read_map(self.folder / "study-out/truth/curvature.fits", dtype=float)
        slope = oracle.slope(self.indices[3], NU0)
        step = 0.05
        ends = [oracle.index(slope, NU0 * numpy.exp(s)) for s in (-step, step)]
        self.assertAlmostEqual(curvature[3], 0.5 * (ends[1] - ends[0]) / (2 * step), delta=1e-4)  # step^2

    def test_clamped_pixels_are_counted_and_told(self):
        indices = numpy.linspace(-3.0, -2.6, 12)
        indices[4] = -1.7  # flatter than any electrons of this law
        self.make({"field": 4.0, **CUTOFF}, indices=indices)
        run = json.loads((self.folder / "study-out/run.json").read_text())
        self.assertEqual(run["electrons"]["clamped_pixels"], 1)
        self.assertTrue(any("1 of 12 pixels" in warning for warning in run["warnings"]), run["warnings"])

    def test_contradictions_are_refused(self):
        self.make({"field": 4.0})
        for extra, words in (("[curvature]\nvalue = 0.1\n", "contradicts [electrons]"),
                             ('cutoff = "sharp"\n', "needs an energy"),
                             ('age = "5 Myr"\n', "no ageing is asked for"),
                             ('aging = "isotropized"\n', "how long"),
                             ("feild = 3\n", "did you mean"),
                             ('field_map = "sky.fits"\n', "contradicts 'field'")):
            model = MODEL.format(polarization="", index="", electrons='field = "4 uG"\n' + extra)
            self.write("model.toml", model)
            done = self.foreglow("make", "study.toml", "--replace", status=2)
            self.assertIn(words, done.stderr)


KEYS = ["frequency_Hz", "ratio", "index", "curvature", "flux_index", "polarized_fraction", "intrinsic_fraction", "energy_GeV",
        "lifetime_Myr"]


class ElectronsCommand(harness.Case):
    def rows(self, *arguments):
        return json.loads(self.foreglow("electrons", *arguments, "--format", "json").stdout)

    def test_rows_are_those_of_the_oracle(self):
        law = electron_oracle.Law(4.0, break_energy=5.0, break_step=1.0, cutoff_energy=30.0, aging="isotropized", age=12.0,
                                  redshift=0.5)
        rows = self.rows("--slope", 2.2, "--field", "4 uG", "--break-energy", "5 GeV", "--break-step", 1, "--cutoff-energy",
                         "30 GeV", "--aging", "isotropized", "--age", "12 Myr", "--redshift", 0.5, "--frequency", "45 MHz",
                         "--frequency", "4.8 GHz")
        self.assertEqual([list(row) for row in rows], [KEYS, KEYS])
        for row, hz in zip(rows, (45e6, 4.8e9)):
            self.assertEqual(row["frequency_Hz"], hz)
            self.assertAlmostEqual(row["ratio"] / law.ratio(2.2, [hz], 408e6)[0], 1, delta=1e-7)  # the oracle's end in ln E
            self.assertAlmostEqual(row["index"], law.index(2.2, hz), delta=1e-6)  # its difference
            self.assertEqual(row["flux_index"], row["index"] + 2)
            fraction = law.emissivity(2.2, hz, polarized=True)[0] / law.emissivity(2.2, hz)[0]
            self.assertAlmostEqual(row["polarized_fraction"], fraction, delta=1e-7)
            energy = numpy.sqrt(1.5 * hz / (electron_oracle.C1 * 4))
            self.assertAlmostEqual(row["energy_GeV"] / energy, 1, delta=1e-9)
            self.assertAlmostEqual(row["lifetime_Myr"] * law.loss(1) * energy, 1, delta=1e-9)

    def test_tangled_fields_have_no_net_polarization(self):
        row, = self.rows("--slope", 2.5, "--field", "5 uG", "--geometry", "tangled")
        self.assertEqual(row["polarized_fraction"], 0)
        self.assertAlmostEqual(row["intrinsic_fraction"], 3.5 / (2.5 + 7 / 3), delta=1e-10)  # Ginzburg & Syrovatskii 1965

    def test_slope_index_and_flux_index_say_the_same(self):
        for option, value in (("--slope", 2.4), ("--index", -2.7), ("--flux-index", -0.7)):
            row, = self.rows(option, value, "--field", "3 uG")
            self.assertAlmostEqual(row["index"], -2.7, delta=1e-10)

    def test_formats_agree_and_a_table_names_its_conventions(self):
        arguments = ["electrons", "--slope", 2.5, "--field", "5 uG", "--frequency", "30 MHz:30 GHz:4"]
        table = self.foreglow(*arguments).stdout
        for words in ("N ~ E^-2.5", "Rayleigh-Jeans", "flux_index = index + 2", "408 MHz", "GeV", "Myr"):
            self.assertIn(words, table)
        self.assertEqual(len(table.splitlines()), 5 + 4)
        csv = self.foreglow(*arguments, "--format", "csv").stdout.splitlines()
        self.assertEqual(csv[0], ",".join(KEYS))
        rows = self.rows(*arguments[1:])
        for line, row in zip(csv[1:], rows, strict=True):
            self.assertEqual([float(cell) for cell in line.split(",")], list(row.values()))

    def test_impossible_requests_are_refused_in_one_line(self):
        for arguments, words in ((["--field", "5 uG"], "--slope"), (["--slope", 2.5], "--field"),
                                 (["--slope", 2.5, "--index", -2.7, "--field", "5 uG"], "say the same"),
                                 (["--slope", 2.5, "--field", "5"], "unit"), (["--slope", 8, "--field", "5 uG"], "from 1 to 7"),
                                 (["--index", -1.5, "--field", "5 uG"], "at 408 MHz"),
                                 (["--slope", 2, "--field", "5 uG", "--break-step", 1], "--break-energy"),
                                 (["--slope", 2, "--field", "5 uG", "--aging", "old"], "continuous"),
                                 (["--slope", 2, "--field", "5 uG", "--frequency", "3"], "--frequency")):
            done = self.foreglow("electrons", *arguments, status=2)
            self.assertEqual(done.stdout, "")
            self.assertEqual(done.stderr.count("\n"), 1)
            self.assertIn(words, done.stderr)


if __name__ == "__main__":
    harness.main()
