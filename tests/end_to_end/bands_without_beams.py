#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Maps without beams, pixel by pixel against tests/oracle/study_oracle.py: bands, units, weightings, laws, precisions.

Tolerances: 1e-6 of the pixel's I (or P) in float64 files and 1e-5 in float32 ones are what the program promises for maps
without beams; rounding to float32 alone is 6e-8.
"""

import healpy
import numpy

import harness
import study_oracle

UNITS = ["K_RJ", "uK_CMB", "MJy/sr", "Jy/pixel"]
WEIGHTS = ["temperature", "radiance", "photon"]
TOLERANCE = {"float64": 1e-6, "float32": 1e-5}

# An invented receiver's response, with a step at 26 GHz and a dip in the middle.
RESPONSE = """frequency_GHz,transmission
25,0
26,0.2
26,0.5
28.5,1
30,0.7
32,1
33.5,0.3
36,0
"""
MODEL = """title = "invented sky"
reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
[polarization]
map = "sky.fits"
columns = [2, 3]
{polarization}
[index]
map = "index.fits"
{index}
[curvature]
map = "curvature.fits"
"""


def channels():
    """Returns the [[channel]] tables: delta, top hats and tables, each with each weighting."""
    text = '[[channel]]\nname = "delta-low"\nfrequency = "45 MHz"\n'
    text += '[[channel]]\nname = "delta-high"\nfrequency = "143 GHz"\nreference_flux_index = -1.0\n'
    for w in WEIGHTS:
        text += f'[[channel]]\nname = "hat-{w}"\nfrequency = "30 GHz"\nbandwidth = "6 GHz"\nresponse_weights = "{w}"\n'
        text += (f'[[channel]]\nname = "wide-{w}"\nfrequency = "353 GHz"\nbandwidth = "110 GHz"\n'
                 f'response_weights = "{w}"\nreference_flux_index = -1.0\n')
        text += (f'[[channel]]\nname = "table-{w}"\nfrequency = "30 GHz"\nresponse = "band.csv"\n'
                 f'response_weights = "{w}"\n')
        text += f'[[channel]]\nname = "own-mean-{w}"\nresponse = "band.csv"\nresponse_weights = "{w}"\n'
    return text


class BandsWithoutBeams(harness.Case):
    def write_inputs(self, polarization="", index="", nside=8):
        sky = harness.make_sky(nside)
        self.write_map("sky.fits", [sky["I"], sky["Q"], sky["U"]], unit="K_RJ", convention="COSMO")
        self.write_map("index.fits", [sky["index"]], names=["INDEX"])
        self.write_map("curvature.fits", [sky["curvature"]], names=["CURVATURE"])
        self.write("band.csv", RESPONSE)
        self.write("model.toml", MODEL.format(polarization=polarization, index=index))
        return sky

    def compare(self, head, tolerance, body=None):
        """Makes a study and holds every channel against the oracle."""
        study = self.write("study.toml", head + (body or channels()))
        self.foreglow("make", study, "--out", "out", "--replace", "--quiet")
        for name, expected in study_oracle.make_study(study).items():
            maps, _ = harness.read_maps(self.folder / f"out/maps/{name}.fits")
            self.assertEqual(maps.shape, expected.shape)
            self.assertLess(harness.pixel_error(maps, expected), tolerance, f"{head}\n{name}")

    def test_units_weightings_precisions(self):
        self.write_inputs()
        for unit in UNITS:
            for precision, tolerance in TOLERANCE.items():
                with self.subTest(unit=unit, precision=precision):
                    self.compare(f'title = "t"\nmodel = "model.toml"\nnside = 8\nstokes = "IQU"\nunit = "{unit}"\n'
                                 f'precision = "{precision}"\ntruth = false\n', tolerance)

    def test_intensity_alone(self):
        self.write_inputs()
        self.compare('model = "model.toml"\nnside = 8\nunit = "mK_RJ"\nprecision = "float64"\n', 1e-6)

    def test_index_from_elsewhere_and_weighting_of_the_whole_study(self):
        for index in ('frequency = "5 GHz"', 'between = ["408 MHz", "23 GHz"]'):
            with self.subTest(index=index):
                for old in self.folder.glob("*.fits"):
                    old.unlink()
                self.write_inputs(index=index)
                self.compare('model = "model.toml"\nnside = 8\nstokes = "IQU"\nunit = "uK_RJ"\nprecision = "float64"\n'
                             'response_weights = "radiance"\nreference_flux_index = -0.7\n', 1e-6)

    def test_polarization_with_a_reference_and_an_index_of_its_own(self):
        for extra in ('reference_frequency = "22.8 GHz"', 'reference_frequency = "22.8 GHz"\nindex = -3.1',
                      'polarization_convention = "COSMO"\nindex_map = "index.fits"'):
            with self.subTest(extra=extra):
                for old in self.folder.glob("*.fits"):
                    old.unlink()
                self.write_inputs(polarization=extra)
                self.compare('model = "model.toml"\nnside = 8\nstokes = "IQU"\nunit = "mK_CMB"\n'
                             'precision = "float64"\n', 1e-6)

    def test_polarization_as_a_fraction_with_angles(self):
        sky = harness.make_sky(8)
        self.write_map("i.fits", [sky["I"] * 1e3], unit="mK_RJ", names=["TEMPERATURE"])
        self.write_map("angle.fits", [numpy.degrees(numpy.arctan2(sky["U"], sky["Q"]) / 2)], names=["ANGLE"])
        self.write("model.toml", """reference_frequency = "1.4 GHz"
[intensity]
map = "i.fits"
zero_level = "8.9 K_RJ"
[polarization]
fraction = 0.2
angle_map = "angle.fits"
polarization_convention = "COSMO"
[index]
value = -2.8
[curvature]
value = -0.05
""")
        self.compare('model = "model.toml"\nnside = 8\nstokes = "IQU"\nunit = "K_RJ"\nprecision = "float64"\n', 1e-6,
                     '[[channel]]\nname = "a"\nfrequency = "60 MHz"\nbandwidth = "20 MHz"\n')

    def test_templates_in_other_units_and_conventions(self):
        sky = harness.make_sky(8)
        self.write("model.toml", """reference_frequency = "94 GHz"
[intensity]
map = "sky.fits"
unit = "{unit}"
[polarization]
map = "sky.fits"
columns = [2, 3]
unit = "{unit}"
[index]
value = -3.0
""")
        template = (self.folder / "model.toml").read_text()
        for unit in ("mK_CMB", "MJy/sr", "Jy/pixel"):
            with self.subTest(unit=unit):
                for old in self.folder.glob("*.fits"):
                    old.unlink()
                self.write_map("sky.fits", [sky["I"], sky["Q"], -sky["U"]], convention="IAU", nested=True, dtype=">f4")
                self.write("model.toml", template.format(unit=unit))
                study = self.write("study.toml", 'model = "model.toml"\nnside = 8\nstokes = "IQU"\nunit = "uK_CMB"\n'
                                   'precision = "float64"\n[[channel]]\nname = "a"\nfrequency = "70 GHz"\n'
                                   'bandwidth = "14 GHz"\n')
                self.foreglow("make", study, "--out", "out", "--replace", "--quiet")
                expected = study_oracle.make_study(study)["a"] * numpy.array([[1.0], [1.0], [-1.0]])  # IAU -> COSMO
                maps, _ = harness.read_maps(self.folder / "out/maps/a.fits")
                self.assertLess(harness.pixel_error(maps, expected), 1e-6)

    def test_channel_grid(self):
        self.write_inputs()
        body = ('[channel_grid]\nname = "g"\nfirst = "50 MHz"\nlast = "200 MHz"\ncount = 4\nspacing = "log"\n'
                'bandwidth = "contiguous"\n')
        study = self.write("study.toml", 'model = "model.toml"\nnside = 8\nprecision = "float64"\n' + body)
        self.foreglow("make", study, "--out", "out", "--quiet")
        model = study_oracle.Model(self.folder / "model.toml", 8)
        centers = 50e6 * 4.0 ** (numpy.arange(4) / 3)
        for number, center in enumerate(centers):
            step = 4.0 ** (1 / 6)  # edges at the geometric means of neighbours, the outer ones by the same ratio
            band = study_oracle.Band([center / step, center * step], [1, 1], "temperature")
            expected = band.average(lambda nu: model.temperature(nu, False), "K_RJ", center, 0.0, healpy.nside2npix(8))
            maps, header = harness.read_maps(self.folder / f"out/maps/g_{number:04d}.fits")
            self.assertLess(harness.pixel_error(maps, expected), 1e-6)
            self.assertAlmostEqual(header["FREQ"] / center, 1, places=12)  # a double in a card of 20 digits


if __name__ == "__main__":
    harness.main()
