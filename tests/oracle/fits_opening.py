#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Opens the FITS maps that our writer made with astropy and healpy, for tests of it.

usage: fits_opening.py OUT FILE [FILE ...]
Every warning of either library is an error, wrong checksums included. Writes all columns of all files into OUT as native
doubles, RING order, NaN for undefined pixels, and one line of facts for each file to standard output.
"""
import sys
import warnings

import healpy
import numpy
from astropy.io import fits

warnings.simplefilter("error")
# healpy 1.16's own use of numpy, no matter of the file
warnings.filterwarnings("ignore", category=DeprecationWarning)

with open(sys.argv[1], "wb") as out:
    for name in sys.argv[2:]:
        with fits.open(name, checksum=True) as hdus:
            hdus.verify("exception")
            for hdu in hdus:
                if hdu.verify_checksum() != 1 or hdu.verify_datasum() != 1:
                    sys.exit(f"{name}: a checksum is wrong")
            header = hdus[1].header
            names = [column.name for column in hdus[1].columns if column.name != "PIXEL"]
            units = [header.get(f"TUNIT{i + 1}", "-") for i in range(header["TFIELDS"])]
        columns = healpy.read_map(name, field=None, dtype=numpy.float64, nest=False)
        columns = numpy.atleast_2d(columns)
        columns[columns == healpy.UNSEEN] = numpy.nan
        columns[columns == numpy.float32(healpy.UNSEEN)] = numpy.nan
        out.write(columns.tobytes())
        print(header["NSIDE"], header["ORDERING"], header["COORDSYS"], ",".join(names), ",".join(units))
