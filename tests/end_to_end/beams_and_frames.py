#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Beams, pixel windows, frames and other nsides against healpy's transforms, iterated until they have converged.

Errors are rms over the map's rms without monopole and dipole: what a study's `accuracy` speaks of. So the tolerance is the
accuracy asked for, 1e-5 where the study does not say, after a rotation too.
"""

import healpy
import numpy

import harness
import study_oracle

ACCURACY = 1e-5  # the default of a study

MODEL = """reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
[polarization]
map = "sky.fits"
columns = [2, 3]
[index]
map = "index.fits"
[curvature]
map = "curvature.fits"
"""
STUDY = 'model = "model.toml"\nnside = 64\nlmax = 128\nstokes = "IQU"\nunit = "uK_RJ"\nprecision = "float64"\n'
CHANNELS = """[[channel]]
name = "a"
frequency = "30 GHz"
bandwidth = "6 GHz"
beam_fwhm = "3 deg"
[[channel]]
name = "b"
frequency = "217 GHz"
beam_fwhm = "3 deg"
[[channel]]
name = "c"
frequency = "1.4 GHz"
beam_fwhm = "5 deg"
"""


class BeamsAndFrames(harness.Case):
    def write_inputs(self, nside=64):
        sky = harness.make_sky(nside)
        self.write_map("sky.fits", [sky["I"], sky["Q"], sky["U"]], unit="K_RJ", convention="COSMO")
        self.write_map("index.fits", [sky["index"]], names=["INDEX"])
        self.write_map("curvature.fits", [sky["curvature"]], names=["CURVATURE"])
        self.write("model.toml", MODEL)

    def compare(self, study_text, tolerance):
        study = self.write("study.toml", study_text)
        self.foreglow("make", study, "--out", "out", "--replace", "--quiet")
        headers = []
        for name, expected in study_oracle.make_study(study).items():
            maps, header = harness.read_maps(self.folder / f"out/maps/{name}.fits")
            self.assertLess(harness.map_error(maps, expected), tolerance, name)
            headers.append(header)
        return headers

    def test_gaussian_beam(self):
        self.write_inputs()
        for header, fwhm in zip(self.compare(STUDY + CHANNELS, ACCURACY), (3, 3, 5)):
            self.assertAlmostEqual(header["BEAMFWHM"], fwhm, places=9)
            self.assertLess(header["ACCURACY"], ACCURACY)

    def test_finer_accuracy(self):
        self.write_inputs()
        for header in self.compare(STUDY + "accuracy = 1e-6\n" + CHANNELS, 1e-6):
            self.assertLess(header["ACCURACY"], 1e-6)

    def test_tabulated_beam_and_pixel_window(self):
        self.write_inputs()
        ell = numpy.arange(129)
        window = numpy.exp(-ell * (ell + 1) * 0.0004) * (1 + 0.1 * numpy.sin(ell / 9))  # invented, with side lobes
        rows = "".join(f"{l},{b:.17g},{0.98 * b:.17g}\n" for l, b in zip(ell, window))
        self.write("window.csv", "l,B_l,B_l_pol\n" + rows)
        channel = '[[channel]]\nname = "a"\nfrequency = "30 GHz"\nbeam_window = "window.csv"\n'
        self.compare(STUDY + channel, ACCURACY)
        self.compare(STUDY + "pixel_window = true\n" + channel, ACCURACY)

    def test_rotation_to_icrs(self):
        self.write_inputs()
        self.compare(STUDY + 'frame = "icrs"\n' + CHANNELS, ACCURACY)
        _, header = harness.read_maps(self.folder / "out/maps/a.fits")
        self.assertEqual(header["COORDSYS"], "C")

    def test_rotation_to_ecliptic(self):
        self.write_inputs()
        self.compare(STUDY + 'frame = "ecliptic"\n' + CHANNELS, ACCURACY)

    def test_template_at_another_nside(self):
        # Band-limited templates, so that there is one right answer: their a_lm synthesised at the study's nside.
        channel = '[[channel]]\nname = "a"\nfrequency = "1 GHz"\n'
        for nside, limit in ((32, 48), (128, 96)):
            with self.subTest(nside=nside):
                for old in self.folder.glob("*.fits"):
                    old.unlink()
                sky = harness.make_sky(nside, lmax=limit)
                self.write_map("sky.fits", [sky["I"], sky["Q"], sky["U"]], unit="K_RJ", convention="COSMO", nested=True)
                self.write("model.toml", MODEL.split("[index]")[0] + "[index]\nvalue = -2.8\n")
                self.write("study.toml", STUDY + channel)
                self.foreglow("make", "study.toml", "--out", "out", "--replace", "--quiet")
                expected = numpy.array(healpy.alm2map(sky["alms"], 64, lmax=limit)) * 1e6 * (1000 / 408) ** -2.8
                maps, _ = harness.read_maps(self.folder / "out/maps/a.fits")
                self.assertLess(harness.map_error(maps, expected), ACCURACY)

    def test_index_map_at_another_nside(self):
        # A coarse index map that is smooth: interpolation must follow it. It varies as 0.2 sin b, whose second derivative
        # of 0.2 over a pixel of 1.8 deg (0.032 rad) leaves 0.2 * 0.032^2/8 = 3e-5 in the index, 3e-5 * ln(1000/408)
        # = 2.3e-5 in T; three times that for the uneven shape of pixels.
        sky = harness.make_sky(64)
        z32, z64 = (healpy.pix2vec(n, numpy.arange(healpy.nside2npix(n)))[2] for n in (32, 64))
        self.write_map("sky.fits", [sky["I"]], unit="K_RJ")
        self.write_map("index.fits", [-2.8 + 0.2 * z32], names=["INDEX"])
        self.write("model.toml", 'reference_frequency = "408 MHz"\n[intensity]\nmap = "sky.fits"\n[index]\nmap = "index.fits"\n')
        self.write("study.toml", 'model = "model.toml"\nnside = 64\nprecision = "float64"\n'
                   '[[channel]]\nname = "a"\nfrequency = "1 GHz"\n')
        self.foreglow("make", "study.toml", "--out", "out", "--quiet")
        maps, _ = harness.read_maps(self.folder / "out/maps/a.fits")
        self.assertLess(harness.pixel_error(maps, [sky["I"] * (1000 / 408) ** (-2.8 + 0.2 * z64)]), 7e-5)


if __name__ == "__main__":
    harness.main()
