#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""A short walk along the whole main path, small enough for a build with sanitizers: templates, band, beam, frame, files, errors."""

import harness
import study_oracle

STUDY = """model = "model.toml"
nside = 16
stokes = "IQU"
unit = "uK_CMB"
precision = "float64"
frame = "icrs"
ordering = "nested"
[[channel]]
name = "a"
frequency = "30 GHz"
bandwidth = "6 GHz"
beam_fwhm = "12 deg"
[[channel]]
name = "b"
frequency = "100 GHz"
beam_fwhm = "12 deg"
"""
MODEL = """reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
[polarization]
map = "sky.fits"
columns = [2, 3]
[index]
map = "index.fits"
[curvature]
value = -0.04
"""


class Short(harness.Case):
    def setUp(self):
        super().setUp()
        sky = harness.make_sky(16)
        self.write_map("sky.fits", [sky["I"], sky["Q"], sky["U"]], unit="K_RJ", convention="COSMO")
        self.write_map("index.fits", [sky["index"]], names=["INDEX"], nested=True, dtype=">f4")
        self.write("model.toml", MODEL)

    def test_main_path(self):
        study = self.write("study.toml", STUDY)
        self.foreglow("make", study, "--out", "out", "--threads", "2")
        for name, expected in study_oracle.make_study(study).items():
            maps, _ = harness.read_maps(self.folder / f"out/maps/{name}.fits")
            self.assertLess(harness.map_error(maps, expected), 1e-5)  # the default accuracy

    def test_bundled_model(self):
        self.foreglow("make", "--model", "quick-sketch", "--frequency", "70 GHz", "--nside", "16", "--out", "out")

    def test_errors(self):
        self.write("study.toml", STUDY.replace("nside = 16", "nside = 17"))
        self.assertIn("nside", self.foreglow("make", "study.toml", status=2).stderr)
        self.write("study.toml", STUDY)
        data = (self.folder / "sky.fits").read_bytes()
        (self.folder / "sky.fits").write_bytes(data[:len(data) // 2])
        self.assertIn("sky.fits", self.foreglow("make", "study.toml", status=1).stderr)


if __name__ == "__main__":
    harness.main()
