#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Real maps of the sky as templates: 61 and 94 GHz, nside 32, thermodynamic mK, Galactic, with neither unit nor frame in the
header. Debian's package healpy-data ships them. A third of their pixels is negative; masked versions have undefined ones.
"""

import glob

import healpy
import numpy

import harness
import study_oracle

DATA = "/usr/share/healpy/test/data/"
MODEL = """reference_frequency = "{frequency}"
[intensity]
map = "{map}"
unit = "mK_CMB"
frame = "galactic"
[polarization]
map = "{map}"
columns = [2, 3]
unit = "mK_CMB"
frame = "galactic"
polarization_convention = "COSMO"
[index]
value = {index}
"""
STUDY = """model = "model.toml"
nside = 32
stokes = "IQU"
unit = "mK_CMB"
precision = "float64"
{extra}
[[channel]]
name = "a"
frequency = "{frequency}"
{channel}
"""


def find(end):
    """Returns the path of the shipped map whose name ends so, and its columns with undefined pixels as NaN."""
    path, = [p for p in glob.glob(DATA + "*udgraded32*.fits") if p.endswith(end) and "/cl_" not in p]
    columns = numpy.array(healpy.read_map(path, field=(0, 1, 2), dtype=float))
    return path, numpy.where(columns == healpy.UNSEEN, numpy.nan, columns)


def filled_share(masked, fwhm_deg):
    """Returns the share of each pixel's Gaussian beam that falls on masked pixels, by a direct sum [npix]."""
    nside = healpy.npix2nside(len(masked))
    vectors = numpy.array(healpy.pix2vec(nside, numpy.arange(len(masked))))
    sigma = numpy.radians(fwhm_deg) / numpy.sqrt(8 * numpy.log(2))
    share = numpy.empty(len(masked))
    for start in range(0, len(masked), 1024):
        here = slice(start, start + 1024)
        beam = numpy.exp((vectors[:, here].T @ vectors - 1) / sigma ** 2)  # 1 - cos t is t^2/2 for a narrow beam
        share[here] = beam @ masked / numpy.sum(beam, axis=1)
    return share


class RealMaps(harness.Case):
    def make(self, path, frequency="70 GHz", reference="61 GHz", index=-3.0, extra="", channel=""):
        self.write("model.toml", MODEL.format(map=path, frequency=reference, index=index))
        self.write("study.toml", STUDY.format(frequency=frequency, extra=extra, channel=channel))
        self.foreglow("make", "study.toml", "--out", "out", "--quiet", "--replace")
        return harness.read_maps(self.folder / "out/maps/a.fits")

    def test_comes_out_as_it_went_in(self):
        path, columns = find("_V_v4_udgraded32.fits")
        maps, header = self.make(path, frequency="61 GHz")
        # The same double twice through one factor and back: four roundings of 1.1e-16, with room to spare.
        numpy.testing.assert_allclose(maps, columns, rtol=1e-14)
        self.assertGreater(numpy.mean(maps[0] < 0), 0.3)
        self.assertEqual(header["TUNIT1"].strip(), "mK_CMB")

    def test_scales_by_a_known_index(self):
        for end, reference, nu in (("_V_v4_udgraded32.fits", "61 GHz", 61e9), ("_W_v4_udgraded32.fits", "94 GHz", 94e9)):
            path, columns = find(end)
            maps, _ = self.make(path, reference=reference, index=-3.0)
            factor = (70e9 / nu) ** -3.0 * study_oracle.thermodynamic_factor(nu) / study_oracle.thermodynamic_factor(70e9)
            numpy.testing.assert_allclose(maps, columns * factor, rtol=1e-12)  # one exp and one log: 1e-15 each

    def test_masked_pixels_stay_undefined(self):
        path, columns = find("_V_v4_udgraded32_masked.fits")
        self.assertEqual(numpy.sum(numpy.isnan(columns[0])), 4686)  # so the file holds what it is said to hold
        maps, header = self.make(path, frequency="61 GHz")
        numpy.testing.assert_allclose(maps, columns, rtol=1e-14)
        self.assertLess(header["BAD_DATA"], -1.6e30)

    def test_masked_pixels_do_not_leak_through_a_beam(self):
        path, columns = find("_V_v4_udgraded32_masked.fits")
        maps, _ = self.make(path, frequency="61 GHz", channel='beam_fwhm = "5 deg"')
        masked = numpy.isnan(columns[0])
        undefined = numpy.isnan(maps[0])
        self.assertTrue(numpy.all(undefined[masked]))
        # The rule is 1 % of the beam's weight. The share here is a plain sum over pixel centres; it differs from an integral
        # over pixels of 1.8 deg by a few parts in a hundred of itself where the beam's flank falls, so a fifth either way.
        share = filled_share(masked, 5.0)
        self.assertTrue(numpy.all(undefined[share > 0.012]))
        self.assertFalse(numpy.any(undefined[(share < 0.008) & ~masked]))
        self.assertGreater(numpy.sum(~undefined), 100)
        # A beam is an average, so no defined pixel leaves the range of its surroundings; a sentinel of -1.6e30 would.
        self.assertLess(numpy.nanmax(numpy.abs(maps[0])), numpy.nanmax(numpy.abs(columns[0])))

    def test_beam_and_rotation_of_a_noisy_sky(self):
        path, _ = find("_W_v4_udgraded32.fits")
        for extra in ("", 'frame = "icrs"'):
            maps, _ = self.make(path, reference="94 GHz", extra=extra, channel='bandwidth = "14 GHz"\nbeam_fwhm = "5 deg"')
            expected = study_oracle.make_study(self.folder / "study.toml")["a"]
            self.assertLess(harness.map_error(maps, expected), 1e-5, extra)  # the default accuracy

    def test_two_surveys_as_one_model(self):
        # Q and U from the other frequency, with its own reference.
        low, columns = find("_V_v4_udgraded32.fits")
        high, others = find("_W_v4_udgraded32.fits")
        text = MODEL.format(map=low, frequency="61 GHz", index=-3.0)
        text = text.replace(f'[polarization]\nmap = "{low}"', f'[polarization]\nmap = "{high}"\nreference_frequency = "94 GHz"')
        self.write("model.toml", text)
        self.write("study.toml", STUDY.format(frequency="94 GHz", extra="", channel=""))
        self.foreglow("make", "study.toml", "--out", "out", "--quiet")
        maps, _ = harness.read_maps(self.folder / "out/maps/a.fits")
        factor = (94 / 61) ** -3.0 * study_oracle.thermodynamic_factor(61e9) / study_oracle.thermodynamic_factor(94e9)
        numpy.testing.assert_allclose(maps[0], columns[0] * factor, rtol=1e-12)
        numpy.testing.assert_allclose(maps[1:], others[1:], rtol=1e-12)

    def test_open_questions_are_asked(self):
        path, _ = find("_V_v4_udgraded32.fits")
        whole = MODEL.format(map=path, frequency="61 GHz", index=-3.0)
        self.write("study.toml", STUDY.format(frequency="70 GHz", extra="", channel=""))
        for line, key in (('unit = "mK_CMB"\n', "unit"), ('frame = "galactic"\n', "frame"),
                          ('polarization_convention = "COSMO"\n', "polarization_convention")):
            with self.subTest(line=line):
                self.write("model.toml", whole.replace(line, "", 1))
                done = self.foreglow("make", "study.toml", "--out", "out", status=2)
                self.assertRegex(done.stderr, rf"\b{key} = ")
                self.assertIn("model.toml", done.stderr)
                self.assertFalse((self.folder / "out").exists())

    def test_unknown_is_no_answer(self):
        path, = glob.glob(DATA + "*W_v4_udgraded32_smoothed10deg_fortran.fits")
        self.write("model.toml", f'reference_frequency = "94 GHz"\n[intensity]\nmap = "{path}"\nunit = "mK_CMB"\n[index]\nvalue = -3\n')
        self.write("study.toml", 'model = "model.toml"\nnside = 32\n[[channel]]\nname = "a"\nfrequency = "94 GHz"\n')
        done = self.foreglow("make", "study.toml", "--out", "out", status=2)  # COORDSYS = 'unknown' in the file
        self.assertRegex(done.stderr, r"\bframe = ")

    def test_gzip_nested_equatorial_map(self):
        # nside 512, NESTED, equatorial, gzip, float32 denormals; probabilities per pixel, taken here for an index.
        path = "/usr/lib/python3/dist-packages/reproject/healpix/tests/data/bayestar.fits.gz"
        column = healpy.read_map(path, field=0, dtype=float)
        self.write_map("flat.fits", [numpy.ones_like(column)], unit="K_RJ", frame="C")
        self.write("model.toml", f'reference_frequency = "1 MHz"\n[intensity]\nmap = "flat.fits"\n[index]\nmap = "{path}"\n')
        self.write("study.toml", 'model = "model.toml"\nnside = 512\nframe = "icrs"\nprecision = "float64"\ntruth = false\n'
                   '[[channel]]\nname = "a"\nfrequency = "1 THz"\n')
        self.foreglow("make", "study.toml", "--out", "out", "--quiet")
        maps, _ = harness.read_maps(self.folder / "out/maps/a.fits")
        # 1e6^p = 1 + 14 p with p up to 1e-5: three roundings near 1, each 2.2e-16.
        numpy.testing.assert_allclose(maps[0], 1e6 ** column, rtol=1e-15)


if __name__ == "__main__":
    harness.main()
