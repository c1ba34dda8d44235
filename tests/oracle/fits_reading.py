#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Reads HEALPix FITS maps with healpy, for tests of our own reader.

usage: fits_reading.py OUT FILE COLUMN [FILE COLUMN ...]   (columns from 0)
Writes the columns one after the other into OUT as native doubles, RING order, NaN for undefined pixels.
"""
import sys
import warnings

import healpy
import numpy

warnings.simplefilter("ignore")
with open(sys.argv[1], "wb") as out:
    for name, column in zip(sys.argv[2::2], sys.argv[3::2]):
        values = healpy.read_map(name, field=int(column), dtype=numpy.float64, nest=False)
        values[numpy.isclose(values, healpy.UNSEEN, rtol=1e-5, atol=0)] = numpy.nan
        out.write(values.tobytes())
