#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Computes what a study's maps should be, slowly and apart from src/: numpy, scipy, healpy, written from definitions.

A channel's map is what a calibration source would read (Planck 2013 IX):

    M(pixel) = integral w(nu) T(pixel, nu) dnu / integral w(nu) t_cal(nu) dnu

with T the Rayleigh-Jeans brightness temperature of the model [K_RJ], t_cal that of one unit of the calibration source, and
w = tau, tau nu^2 or tau nu for response_weights temperature, radiance and photon. Maps are RING, COSMO, [1 or 3][npix].
The oracle reads the same TOML files as the program, so that both are asked the same question; it knows only the keys used
in tests/end_to_end. Run by itself it checks its units and bands against published values (see check_published_values).
"""

import sys
import tomllib
from pathlib import Path

import healpy
import numpy
from astropy.io import fits

SPEED_OF_LIGHT = 299792458.0       # m/s, exact in the SI of 2019
PLANCK = 6.62607015e-34            # J s, exact
BOLTZMANN = 1.380649e-23           # J/K, exact
T_CMB = 2.7255                     # K, Fixsen 2009
MEGAJANSKY = 1e-20                 # W m^-2 Hz^-1
FREQUENCY_UNITS = {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "GHz": 1e9, "THz": 1e12}
ANGLE_UNITS = {"deg": 1.0, "arcmin": 1 / 60, "arcsec": 1 / 3600}
FRAME_LETTERS = {"galactic": "G", "icrs": "C", "ecliptic": "E"}


def frequency_hz(text):
    number, unit = text.split()
    return float(number) * FREQUENCY_UNITS[unit]


def angle_rad(text):
    number, unit = text.split()
    return numpy.radians(float(number) * ANGLE_UNITS[unit])


# Units

def thermodynamic_factor(nu):
    """Returns the K_RJ of 1 K_CMB, x^2 e^x/(e^x - 1)^2 with x = h nu/(k T_CMB): dB/dT over its Rayleigh-Jeans form."""
    x = PLANCK * nu / (BOLTZMANN * T_CMB)
    return (x / 2 / numpy.sinh(x / 2)) ** 2


def calibration_temperature(unit, nu, reference, flux_index, npix):
    """Returns t_cal(nu) [K_RJ]: the brightness temperature of one unit of the calibration source."""
    scale = 1.0
    if unit.endswith(("K_RJ", "K_CMB")):
        scale = {"K": 1.0, "m": 1e-3, "u": 1e-6}[unit[0]]
    if unit.endswith("K_RJ"):
        return scale * numpy.ones_like(nu)
    if unit.endswith("K_CMB"):
        return scale * thermodynamic_factor(nu)
    intensity = MEGAJANSKY * (nu / reference) ** flux_index
    if unit == "Jy/pixel":
        intensity = intensity * 1e-6 * npix / (4 * numpy.pi)
    elif unit != "MJy/sr":
        raise ValueError(f"unit {unit}")
    return intensity * SPEED_OF_LIGHT ** 2 / (2 * BOLTZMANN * nu ** 2)


# Bands

class Band:
    """Holds the nodes and weights of integrals over a response: integral w(nu) f(nu) dnu = sum weights f(nodes)."""

    NODES, PIECE = 24, 1.05  # Gauss-Legendre of 24 nodes on pieces of 5 %: exact to rounding for any power law and t_cal

    def __init__(self, nu, tau, response_weights):
        """nu [Hz] ascending (a value twice is a step), tau linear in between and 0 outside; one nu alone is a delta."""
        nu, tau = numpy.asarray(nu, float), numpy.asarray(tau, float)
        if len(nu) == 1:
            self.nodes, self.weights = nu, numpy.ones(1)
            return
        x, w = numpy.polynomial.legendre.leggauss(self.NODES)
        nodes, weights = [], []
        for low, high, tau_low, tau_high in zip(nu[:-1], nu[1:], tau[:-1], tau[1:]):
            if high == low:
                continue
            edges = numpy.linspace(low, high, 1 + max(1, int(numpy.ceil((high - low) / (low * (self.PIECE - 1))))))
            for a, b in zip(edges[:-1], edges[1:]):
                here = (a + b) / 2 + (b - a) / 2 * x
                nodes.append(here)
                weights.append((b - a) / 2 * w * (tau_low + (tau_high - tau_low) * (here - low) / (high - low)))
        self.nodes, self.weights = numpy.concatenate(nodes), numpy.concatenate(weights)
        self.weights = self.weights * self.nodes ** {"temperature": 0, "radiance": 2, "photon": 1}[response_weights]

    def mean_frequency(self):
        """Returns the w-weighted mean frequency, the reference of a response that names none."""
        return numpy.sum(self.weights * self.nodes) / numpy.sum(self.weights)

    def average(self, temperature, unit, reference, flux_index, npix):
        """Returns the map M from temperature(nu) -> array [..., npix] in K_RJ."""
        total = 0.0
        for nu, weight in zip(self.nodes, self.weights):
            total = total + weight * temperature(nu)
        return total / numpy.sum(self.weights * calibration_temperature(unit, self.nodes, reference, flux_index, npix))


def read_response(path):
    """Returns nu [Hz] and tau of a two-column file whose header names the unit: frequency_GHz,transmission."""
    lines = [line for line in Path(path).read_text().splitlines() if line.strip() and not line.startswith("#")]
    unit = lines[0].split(",")[0].strip().removeprefix("frequency_")
    rows = numpy.array([[float(cell) for cell in line.split(",")] for line in lines[1:]])
    return rows[:, 0] * FREQUENCY_UNITS[unit], rows[:, 1]


# Models

def read_columns(path, columns, hdu=1):
    """Returns full-sky RING columns of a HEALPix file [ncol][npix], undefined pixels as NaN."""
    with fits.open(path) as file:
        table = file[hdu]
        nside, nested = table.header["NSIDE"], table.header["ORDERING"].strip().upper().startswith("NEST")
        values = [numpy.asarray(table.data.field(c - 1), dtype=float).ravel() for c in columns]
        if table.header.get("INDXSCHM", "IMPLICIT").strip() == "EXPLICIT":
            pixels = numpy.asarray(table.data.field(0), dtype=int).ravel()
            full = numpy.full((len(values), healpy.nside2npix(nside)), numpy.nan)
            full[:, pixels] = values
            values = list(full)
    values = [numpy.where(numpy.isclose(v, healpy.UNSEEN, rtol=1e-5), numpy.nan, v) for v in values]
    if nested:
        values = [healpy.reorder(v, n2r=True) for v in values]
    return numpy.array(values)


class Model:
    """Holds what a model file says; temperature(nu) is its sky at one frequency, [1 or 3][npix] in K_RJ."""

    def __init__(self, path, nside):
        self.folder, self.nside = Path(path).parent, nside
        text = tomllib.loads(Path(path).read_text())
        self.reference = frequency_hz(text["reference_frequency"])
        section = text["intensity"]
        self.frame = section.get("frame", "galactic")
        self.intensity = self.read_brightness(section, [section.get("column", 1)], self.reference)[0]
        if "zero_level" in section:
            value, unit = section["zero_level"].split()
            self.intensity = self.intensity - float(value) * self.monochromatic(unit, self.reference)
        index, curvature = text.get("index", {"value": -3.0}), text.get("curvature", {"value": 0.0})
        self.curvature = self.value_or_map(curvature)
        measured = self.reference
        if "frequency" in index:
            measured = frequency_hz(index["frequency"])
        if "between" in index:
            measured = numpy.sqrt(numpy.prod([frequency_hz(f) for f in index["between"]]))
        self.index = self.value_or_map(index) - 2 * self.curvature * numpy.log(measured / self.reference)
        self.polarization = None
        if "polarization" in text:
            self.read_polarization(text["polarization"])

    def read_polarization(self, section):
        self.polarization_reference = frequency_hz(section["reference_frequency"]) \
            if "reference_frequency" in section else self.reference
        self.polarization_index = None
        if "index" in section or "index_map" in section:
            self.polarization_index = self.value_or_map(section, "index", "index_map")
        if "map" in section:
            self.polarization = self.read_brightness(section, section["columns"], self.polarization_reference)
        else:  # a fraction of the intensity at the polarization's reference, with an angle in degrees
            strength = self.value_or_map(section, "fraction", "fraction_map") * self.intensity * \
                self.curve(self.polarization_reference)
            angle = numpy.radians(read_columns(self.folder / section["angle_map"], [1])[0])
            self.polarization = numpy.array([strength * numpy.cos(2 * angle), strength * numpy.sin(2 * angle)])
        if section.get("polarization_convention", "COSMO") == "IAU":
            self.polarization = self.polarization * numpy.array([[1.0], [-1.0]])

    def value_or_map(self, section, value="value", map_key="map"):
        if map_key in section:
            return read_columns(self.folder / section[map_key], [section.get("column", 1)])[0]
        return float(section[value])

    def monochromatic(self, unit, nu):
        return calibration_temperature(unit, numpy.array(nu), nu, 0.0, healpy.nside2npix(self.nside))

    def read_brightness(self, section, columns, nu):
        path = self.folder / section["map"]
        unit = section.get("unit")
        if unit is None:
            unit = fits.getheader(path, 1)[f"TUNIT{columns[0]}"].strip()
        return read_columns(path, columns) * self.monochromatic(unit, nu)

    def curve(self, nu):
        """Returns T(nu)/T(nu0) = (nu/nu0)^(beta + c ln(nu/nu0)) of the intensity."""
        x = numpy.log(nu / self.reference)
        return numpy.exp(x * (self.index + self.curvature * x))

    def temperature(self, nu, polarized):
        intensity = self.intensity * self.curve(nu)
        if not polarized:
            return numpy.array([intensity])
        if self.polarization_index is None:
            factor = self.curve(nu) / self.curve(self.polarization_reference)
        else:
            factor = (nu / self.polarization_reference) ** self.polarization_index
        return numpy.array([intensity, *(self.polarization * factor)])


# Harmonics

def analyse(maps, lmax):
    """Returns converged a_lm of [1 or 3] maps: Jacobi iterations of HEALPix's analysis until nothing moves any more."""
    maps = [m for m in maps]
    iterations = 12  # each gains a factor of 8 at lmax = 2 nside (measured: 3e-6 after 3, 2e-14 after 12)
    if len(maps) == 1:
        return [healpy.map2alm(maps[0], lmax=lmax, iter=iterations)]
    return list(healpy.map2alm(maps, lmax=lmax, iter=iterations, pol=True))


def synthesise(alms, nside, lmax):
    if len(alms) == 1:
        return numpy.array([healpy.alm2map(alms[0], nside, lmax=lmax)])
    return numpy.array(healpy.alm2map(alms, nside, lmax=lmax, pol=True))


def beam_windows(channel, folder, lmax, count):
    """Returns B_l [count][lmax + 1]; E and B of a Gaussian have the factor exp(2 sigma^2) (Challinor et al. 2000)."""
    ell = numpy.arange(lmax + 1)
    if "beam_window" in channel:
        rows = numpy.array([[float(cell) for cell in line.split(",")]
                            for line in (folder / channel["beam_window"]).read_text().splitlines()[1:]])
        intensity, polarization = rows[:lmax + 1, 1], rows[:lmax + 1, -1]
    elif "beam_fwhm" in channel:
        sigma = angle_rad(channel["beam_fwhm"]) / numpy.sqrt(8 * numpy.log(2))
        intensity = numpy.exp(-ell * (ell + 1) * sigma ** 2 / 2)
        polarization = numpy.exp(-(ell * (ell + 1) - 4) * sigma ** 2 / 2)
    else:
        intensity = polarization = numpy.ones(lmax + 1)
    return [intensity, polarization, polarization][:count]


def rotate(alms, source, target):
    """Returns the a_lm in another frame ("G", "C", "E"), polarization carried along."""
    rotator = healpy.Rotator(coord=[source, target])
    if len(alms) == 1:
        return [rotator.rotate_alm(alms[0])]
    return list(rotator.rotate_alm(alms))


# Studies

def channel_response(channel, study, folder):
    """Returns the channel's Band, its reference frequency [Hz] and the flux index of its calibration source."""
    weights = channel.get("response_weights", study.get("response_weights", "temperature"))
    center = frequency_hz(channel["frequency"]) if "frequency" in channel else None
    if "response" in channel:
        band = Band(*read_response(folder / channel["response"]), weights)
    elif "bandwidth" in channel:
        half = frequency_hz(channel["bandwidth"]) / 2
        band = Band([center - half, center + half], [1, 1], weights)
    else:
        band = Band([center], [1], weights)
    flux_index = channel.get("reference_flux_index", study.get("reference_flux_index", 0.0))
    return band, center if center is not None else band.mean_frequency(), flux_index


def make_channel(channel, study, folder, model):
    nside, npix = study["nside"], healpy.nside2npix(study["nside"])
    polarized = study.get("stokes", "I") == "IQU"
    band, reference, flux_index = channel_response(channel, study, folder)
    maps = band.average(lambda nu: model.temperature(nu, polarized), study.get("unit", "K_RJ"), reference, flux_index, npix)
    target = study.get("frame", "galactic")
    smooth = "beam_fwhm" in channel or "beam_window" in channel or study.get("pixel_window", False)
    if smooth or target != model.frame:
        lmax = study.get("lmax", 2 * nside)
        alms = analyse(maps, lmax)
        windows = beam_windows(channel, folder, lmax, len(alms))
        if study.get("pixel_window", False):
            pixel = healpy.pixwin(nside, pol=True, lmax=lmax)
            windows = [w * pixel[min(i, 1)] for i, w in enumerate(windows)]
        alms = [healpy.almxfl(a, w) for a, w in zip(alms, windows)]
        if target != model.frame:
            alms = rotate(alms, FRAME_LETTERS[model.frame], FRAME_LETTERS[target])
        maps = synthesise(alms, nside, lmax)
    if study.get("monopole", "keep") == "remove":
        maps[0] = maps[0] - numpy.nanmean(maps[0])
    return maps


def make_study(path):
    """Returns {channel: maps [1 or 3][npix]} of a study file, RING and COSMO whatever the study's files are to be."""
    path = Path(path)
    study = tomllib.loads(path.read_text())
    model = Model(path.parent / study["model"], study["nside"])
    return {channel["name"]: make_channel(channel, study, path.parent, model) for channel in study["channel"]}


# The oracle against values from outside

# The factors at four frequencies: astropy.units.thermodynamic_temperature and brightness_temperature (astropy 5.2) give the
# same to 1.3e-15; the last digit printed limits the comparison.
UNITS = [  # GHz, K_RJ -> K_CMB, MJy/sr per K_RJ, MJy/sr per K_CMB
    (0.408, 1.000004301233, 0.005114370644496, 0.005114348646492),
    (30, 1.023472292418, 27.65122537033, 27.01707273873),
    (70, 1.133198953383, 150.5455603496, 132.8500700606),
    (353, 12.90549557014, 3828.435046857, 296.6515331434)]
# Top-hat bands on T = 1 K_RJ (nu/nu0)^-3.1, calibrated at nu0, by the definitions of Planck 2013 IX (eqs. 1-8), computed
# with mpmath to 20 digits: low, high, nu0 [GHz], weights, K_RJ, K_CMB, MJy/sr with flux index -1, MJy/sr with flux index 0.
TOP_HATS = [
    (27, 33, 30, "radiance", 1.0005395177, 1.0244143863, 27.665588253, 27.758364175),
    (27, 33, 30, "temperature", 1.0215174103, 1.0455709553, 27.68410859, 27.96374605),
    (85, 115, 100, "radiance", 1.0012788735, 1.2987506207, 307.59733516, 309.93596886),
    (85, 115, 100, "temperature", 1.0493835389, 1.3511947992, 308.06307919, 315.1540452),
    (300, 400, 353, "radiance", 1.0279922245, 12.848815704, 3835.78863, 3895.3113077),
    (300, 400, 353, "temperature", 1.0726513027, 12.673890494, 3841.0519355, 3954.6830552),
    (0.39, 0.426, 0.408, "radiance", 1.0001014247, 1.0001057403, 0.0051148854898, 0.0051182078516),
    (0.39, 0.426, 0.408, "temperature", 1.0041355698, 1.0041398917, 0.0051155497197, 0.005125525873)]
# A table, linear between its rows, same sky with nu0 = 30 GHz (mpmath).
TABLE = ([25, 27, 28.5, 30, 32, 33.5, 36], [0, .4, 1, .9, 1, .3, 0])


def check_close(what, value, expected, digits):
    """Fails unless value agrees with a number printed to so many significant digits."""
    if not abs(value / expected - 1) <= 0.6 * 10.0 ** (1 - digits):
        sys.exit(f"{what}: {value!r}, expected {expected!r}")


def check_published_values():
    for ghz, cmb, per_rj, per_cmb in UNITS:
        nu = numpy.array(ghz * 1e9)
        check_close(f"K_CMB at {ghz}", 1 / thermodynamic_factor(nu), cmb, 13)
        megajansky = 1 / calibration_temperature("MJy/sr", nu, nu, 0.0, 12)
        check_close(f"MJy/sr per K_RJ at {ghz}", megajansky, per_rj, 13)
        check_close(f"MJy/sr per K_CMB at {ghz}", megajansky * thermodynamic_factor(nu), per_cmb, 13)
    for low, high, center, weights, *expected in TOP_HATS:
        band = Band([low * 1e9, high * 1e9], [1, 1], weights)
        check_band(f"top hat {low}-{high} GHz, {weights}", band, center * 1e9, expected, 10)
    band = Band(numpy.array(TABLE[0]) * 1e9, TABLE[1], "radiance")
    check_band("table, radiance", band, 30e9, (0.979113831539, 1.00300735349, 27.6531966663, None), 11)
    band = Band(numpy.array(TABLE[0]) * 1e9, TABLE[1], "temperature")
    check_band("table, temperature", band, 30e9, (1.01008850687, None, None, None), 11)


def check_band(what, band, center, expected, digits):
    def sky(nu):
        return (nu / center) ** -3.1
    units = [("K_RJ", 0.0), ("K_CMB", 0.0), ("MJy/sr", -1.0), ("MJy/sr", 0.0)]
    for (unit, flux_index), number in zip(units, expected):
        if number is not None:
            check_close(f"{what}, {unit}, flux index {flux_index}",
                        band.average(sky, unit, center, flux_index, 12), number, digits)


def check_steps_and_means():
    # A step written as the same frequency twice is a top hat, and the mean of a symmetric band is its middle.
    stepped = Band([1e9, 1e9, 2e9, 2e9], [0, 1, 1, 0], "temperature")
    flat = Band([1e9, 2e9], [1, 1], "temperature")
    check_close("a step", numpy.sum(stepped.weights * stepped.nodes ** -3.1), numpy.sum(flat.weights * flat.nodes ** -3.1), 15)
    check_close("the mean", flat.mean_frequency(), 1.5e9, 15)
    # integral nu^3/integral nu^2 over 1..2 = (15/4)/(7/3)
    check_close("the weighted mean", Band([1e9, 2e9], [1, 1], "radiance").mean_frequency(), 1e9 * 45 / 28, 15)


def check_harmonics():
    # A band-limited map comes back from analyse() to rounding: the iterations are enough at lmax = 2 nside.
    random = numpy.random.default_rng(5)
    nside, lmax = 16, 32
    size = healpy.Alm.getsize(lmax)
    alms = [random.standard_normal(size) + 1j * random.standard_normal(size) for _ in range(3)]
    for a in alms:
        a[:lmax + 1] = a[:lmax + 1].real
    for a in alms[1:]:
        a[[healpy.Alm.getidx(lmax, ell, m) for ell in (0, 1) for m in range(ell + 1)]] = 0
    back = analyse(synthesise(alms, nside, lmax), lmax)
    worst = max(numpy.max(numpy.abs(b - a)) for a, b in zip(alms, back))
    if not worst < 1e-9:  # values of order 1; 12 iterations of a factor 8 leave 1e-11, and small grids converge slower
        sys.exit(f"analysis has not converged: {worst}")


if __name__ == "__main__":
    check_published_values()
    check_steps_and_means()
    check_harmonics()
    print("the oracle agrees with the published values")
