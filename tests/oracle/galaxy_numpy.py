# SPDX-License-Identifier: GPL-2.0-or-later
"""The built-in Galaxy's lines of sight in numpy and scipy, written from the formulas of docs/physics.md alone.

The oracle of the C++ integral (galaxy_sightlines.py) and what its speed is compared with (tests/benchmarks).
"""

import numpy as np
from scipy.interpolate import CubicSpline, RectBivariateSpline
from scipy.special import kv

E, M, C, EPS0, K_B = 1.602176634e-19, 9.1093837015e-31, 299792458.0, 8.8541878128e-12, 1.380649e-23  # CODATA 2018
KPC = 3.0856775814913673e19
GEV = E * 1e9
C1 = 3 * E / (4 * np.pi * M**3 * C**4) * 1e-10 * GEV**2 / 1e6  # MHz per uG GeV^2
DEPTH = E**3 / (8 * np.pi**2 * EPS0 * M**2 * C**3) * 1e6 * 1e-10 * KPC  # rad/m^2 per cm^-3 uG kpc
R0, RMAX, ZMAX, DMAX, LTURB = 8.2, 22.0, 12.0, 30.0, 0.06
PITCH = np.radians(-11.5)


def kernel_f(x):
    """F(x) = x integral of K_5/3 = x integral over t of exp(-x cosh t) cosh(5 t/3)/cosh t (trapezoid)."""
    t = np.linspace(0, 60, 6001)
    weights = np.full(t.size, t[1])
    weights[0] *= 0.5
    log_term = -np.outer(x, np.cosh(t)) + np.logaddexp(5 * t / 3, -5 * t / 3) - np.logaddexp(t, -t)
    return x * (np.exp(log_term) @ weights)


def old_electrons(energy, z):
    def shape(e):
        return (e / 10) ** -1.8 * (1 + (e / 3.5) ** 2) ** (-(3.42 - 1.8) * 0.5)
    height = 2.6 * (1 + energy / 3) ** -0.4
    return 1.15e-8 * shape(energy) / shape(10) * np.exp(-z / height)


def young_electrons(energy):
    return 0.55 * 1.15e-8 * (energy / 10) ** -2.6 * np.exp(-(energy - 10) / 200) * (1 + 2.5 / energy) ** -0.6


class Table:
    """ln Phi of both discs as splines in ln a and t, z = 12 t^2."""

    def __init__(self):
        log_e = np.linspace(np.log(1e-3), np.log(1e7), 1401)
        energy, step = np.exp(log_e), log_e[1] - log_e[0]
        log_x = np.linspace(np.log(1e-22), np.log(600), 4001)
        kernel = CubicSpline(log_x, np.log(kernel_f(np.exp(log_x))))
        self.log_a = np.linspace(np.log(1e-3), np.log(3e6), 241)
        t = np.linspace(-0.1, 1, 133)  # a little beyond the even point, so that the spline's end is not in use
        x = self.log_a[:, None] - 2 * log_e[None, :]
        f = np.where(x < np.log(600), np.exp(kernel(np.clip(x, log_x[0], log_x[-1]))), 0) * energy * step
        self.old = RectBivariateSpline(self.log_a, t, np.log(f @ old_electrons(energy[:, None], 12 * t[None, :] ** 2)))
        self.young = CubicSpline(self.log_a, np.log(f @ young_electrons(energy)))


def rad(r, scale, core):
    return np.exp(-(np.hypot(r, core) - np.hypot(R0, core)) / scale)


def galaxy_at(x, y, z):
    """Returns field (regular, uG), its random rms, thermal electrons, densities of the two discs."""
    r, height = np.hypot(x, y), np.abs(z)
    phi = np.arctan2(y, x)
    psi = phi + np.log(np.maximum(r, 1e-10) / R0) / np.tan(PITCH)
    a = 1 + 0.35 * np.cos(2 * (psi - 0.5)) * (1 - np.exp(-(r / 3) ** 2)) * np.exp(-(z / 0.6) ** 2)
    disc = (2.7 * rad(r, 14, 2) * np.exp(-height / 0.9) * a * (1 - np.exp(-(r / 2) ** 2)) * np.tanh((r - 6.8) / 0.4))
    halo = 2.6 * np.tanh(z / 0.3) / (1 + ((height - 1.4) / 1.2) ** 2) * (r / 8) * np.exp(1 - r / 8)
    b_r, b_phi = disc * np.sin(PITCH), -disc * np.cos(PITCH) + halo
    field = np.array([b_r * np.cos(phi) - b_phi * np.sin(phi), b_r * np.sin(phi) + b_phi * np.cos(phi),
                      0.25 * rad(r, 14, 2)])
    random = 6.2 * rad(r, 28, 2.5) * np.exp(-height / 2.6) * np.sqrt(np.maximum(a, 0.1))
    gas = 0.014 * np.exp(-height / 1.6) * rad(r, 10, 2) + 0.02 * np.exp(-height / 0.12) * rad(r, 5, 3) * a
    young = rad(r, 4.5, 3) * np.exp(-height / 0.3) * np.maximum(0, 1 + 2 * (a - 1))
    return field, random, gas, rad(r, 19, 2.5), young


def sightline(table, lon, lat, frequencies_hz, steps):
    """Returns I, Q, U (K_RJ, COSMO) at each frequency, the rotation measure and its rms; degrees in."""
    l, b = np.radians(lon), np.radians(lat)
    n = np.array([np.cos(b) * np.cos(l), np.cos(b) * np.sin(l), np.sin(b)])
    south = np.array([np.sin(b) * np.cos(l), np.sin(b) * np.sin(l), -np.cos(b)])
    east = np.array([-np.sin(l), np.cos(l), 0])
    in_plane = n[0] ** 2 + n[1] ** 2
    leave = (R0 * n[0] + np.sqrt(R0**2 * n[0] ** 2 - in_plane * (R0**2 - RMAX**2))) / in_plane
    dmax = min(leave, DMAX, ZMAX / abs(n[2]) if n[2] else np.inf)
    u_step = np.log1p(dmax / 0.3) / steps
    grown = np.exp((np.arange(steps) + 0.5) * u_step)
    d, dd = 0.3 * (grown - 1), 0.3 * grown * u_step
    x, y, z = -R0 + d * n[0], d * n[1], d * n[2]
    field, random, gas, old, young = galaxy_at(x, y, z)
    b_south, b_east, b_los = south @ field, east @ field, -(n @ field)
    b_eff = np.sqrt(b_south**2 + b_east**2 + 2 / 3 * random**2)
    depth = DEPTH * gas * b_los * dd
    dispersion = (DEPTH * gas * random) ** 2 / 3 * LTURB * dd
    depth_there = np.cumsum(depth) - 0.5 * depth
    dispersion_there = np.cumsum(dispersion) - 0.5 * dispersion
    t = np.sqrt(np.abs(z) / ZMAX)
    constant = np.sqrt(3) * E**3 * 1e-10 / (16 * np.pi**2 * EPS0 * M * C) * KPC
    stokes = []
    for hz in frequencies_hz:
        log_a = np.log(hz / 1e6 / C1 / b_eff)
        old_part = np.exp(table.old(log_a, t, grid=False)) * old
        young_part = np.exp(table.young(log_a)) * young
        slope = (old_part * table.old(log_a, t, dx=1, grid=False) + young_part * table.young(log_a, 1)) / (
            old_part + young_part)
        s = 1 - 2 * slope
        emission = constant * b_eff * (old_part + young_part) * dd * (C / hz) ** 2 / (2 * K_B)
        lambda2 = (C / hz) ** 2
        p = (s + 1) / (s + 7 / 3) * emission / b_eff**2 * np.sinc(lambda2 * depth / np.pi) * np.exp(
            -2 * dispersion_there * lambda2**2)
        turned = p * -((b_south**2 - b_east**2) + 2j * b_south * b_east) * np.exp(-2j * depth_there * lambda2)
        stokes.append((emission.sum(), turned.sum().real, turned.sum().imag))
    return np.array(stokes), depth.sum(), np.sqrt(dispersion.sum())
