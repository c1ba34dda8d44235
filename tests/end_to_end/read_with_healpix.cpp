// SPDX-License-Identifier: GPL-2.0-or-later
// Reads a full-sky map with the HEALPix C++ library, as a stranger's program would, and prints its nside and
// the sum of each column weighted by (pixel + 1)/npix in RING order.
#include <healpix_map.h>
#include <healpix_map_fitsio.h>

#include <cmath>
#include <cstdio>
#include <cstdlib>

int main(int argc, char** argv) {
    if (argc != 3) {
        std::fprintf(stderr, "usage: read_with_healpix MAP.fits COLUMNS\n");
        return 2;
    }
    try {
        for (int column = 1; column <= std::atoi(argv[2]); ++column) {
            Healpix_Map<double> map;
            read_Healpix_map_from_fits(argv[1], map, column, 2);
            if (map.Scheme() == NEST) {
                map.swap_scheme();
            }
            double sum = 0;
            for (int pixel = 0; pixel < map.Npix(); ++pixel) {
                if (!approx<double>(map[pixel], Healpix_undef) && std::isfinite(map[pixel])) {
                    sum += map[pixel] * (pixel + 1) / map.Npix();
                }
            }
            if (column == 1) {
                std::printf("%d", map.Nside());
            }
            std::printf(" %.17g", sum);
        }
        std::printf("\n");
    } catch (const PlanckError&) {
        return 1;
    }
    return 0;
}
