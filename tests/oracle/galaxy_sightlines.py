#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Writes galaxy_sightlines.csv: lines of sight through the built-in Galaxy's disc, 3000 steps each, by galaxy_numpy.py.

Usage: galaxy_sightlines.py > galaxy_sightlines.csv
"""

from galaxy_numpy import Table, sightline

FREQUENCIES_MHZ = (45, 408, 1420, 23000, 353000)
PLACES = ((60, 1), (180, 0.5), (180, 30), (120, -45), (0, 0.05), (1.5, -2), (30, 0), (250, 4), (300, -12), (45, 60),
          (200, -89), (329, 17.5))

if __name__ == "__main__":
    table = Table()
    print("# SPDX-License-Identifier: GPL-2.0-or-later")
    print("# lon, lat [deg]; frequency [MHz]; I, Q, U [K_RJ, COSMO]; rotation measure [rad/m^2], its rms")
    print("lon,lat,frequency_MHz,I,Q,U,depth,dispersion")
    for lon, lat in PLACES:
        stokes, depth, rms = sightline(table, lon, lat, [f * 1e6 for f in FREQUENCIES_MHZ], 3000)
        for mhz, (i, q, u) in zip(FREQUENCIES_MHZ, stokes):
            print(f"{lon},{lat},{mhz},{i:.10e},{q:.10e},{u:.10e},{depth:.10e},{rms:.10e}")
