#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Brightness of electron distributions by direct double integrals in numpy: over the energies that the electrons have NOW
(the program integrates over those that they were injected with), kernels by quadrature.

Formulas: Rybicki & Lightman 1979 sec. 6.4; Pacholczyk 1970 ch. 6 (ageing N(E, t) = N0(E/y) y^-2, y = 1 - b E t).
Run by itself it checks itself against closed forms.
"""

import numpy
from scipy import constants, optimize, special

C1 = 3 * constants.e / (4 * numpy.pi * constants.m_e**3 * constants.c**4) * 1e-10 * (1e9 * constants.e) ** 2
C2 = (8 * numpy.pi / 3 * (constants.physical_constants["classical electron radius"][0]) ** 2 * constants.epsilon_0
      * constants.c**3 / (constants.m_e * constants.c**2) ** 2 * 1e-20 * 1e9 * constants.e * 1e6 * 365.25 * 86400)
NODES, WEIGHTS = numpy.polynomial.legendre.leggauss(20)


def kernel_f(x):
    """x int_x^inf K_5/3 = x int_0^inf exp(-x cosh t) cosh(5t/3)/cosh(t) dt; the step serves x < 200."""
    x = numpy.asarray(x, float)
    small = x < 0.05  # int_0^inf of K_5/3 less int_0^x, whose series needs few terms there
    result = numpy.zeros_like(x)
    t = 0.04 * numpy.arange(160)
    weight = numpy.full(t.size, 0.04)
    weight[0] *= 0.5
    big = ~small & (x < 690)
    for index in numpy.array_split(numpy.flatnonzero(big), max(1, big.sum() // 20000)):
        with numpy.errstate(under="ignore"):
            result.flat[index] = x.flat[index] * (
                numpy.exp(-x.flat[index][:, None] * numpy.cosh(t)) @ (weight * numpy.cosh(5 * t / 3) / numpy.cosh(t)))
    nu = 5 / 3
    xs = x[small]
    total = -numpy.ones_like(xs)
    for k in range(6):
        for sign, order in ((1, -nu), (-1, nu)):
            total += sign * 2 * (xs / 2) ** (2 * k + order + 1) / (
                (2 * k + order + 1) * special.factorial(k) * special.gamma(k + order + 1))
    result[small] = xs * numpy.pi / numpy.sqrt(3) * total
    return result


def kernel_g(x):
    return x * special.kv(2 / 3, x)


def panels(edges, widest):
    """Gauss-Legendre nodes and weights between ascending edges, in panels no wider than `widest`."""
    nodes, weights = [], []
    for low, high in zip(edges[:-1], edges[1:]):
        if not high > low:
            continue
        count = int(numpy.ceil((high - low) / widest))
        ends = numpy.linspace(low, high, count + 1)
        middle, half = 0.5 * (ends[1:] + ends[:-1]), 0.5 * (ends[1:] - ends[:-1])
        nodes.append((middle[:, None] + half[:, None] * NODES).ravel())
        weights.append((half[:, None] * WEIGHTS).ravel())
    return numpy.concatenate(nodes), numpy.concatenate(weights)


class Law:
    """field [uG], tangled, break_energy [GeV] and break_step, cutoff_energy [GeV] and cutoff, aging, age [Myr], edge, redshift."""

    def __init__(self, field, tangled=False, break_energy=None, break_step=1.0, cutoff_energy=None, cutoff="exponential",
                 aging="none", age=0.0, edge="sharp", redshift=0.0):
        self.__dict__.update(locals())

    def loss(self, sine):
        microwave = 3.25 * (1 + self.redshift) ** 2
        if self.aging == "fixed-pitch":
            return C2 * (self.field**2 * sine**2 + 2 / 3 * microwave**2)
        return 2 / 3 * C2 * (self.field**2 + microwave**2)

    def injected(self, energy, slope):
        n = energy**-slope
        if self.break_energy:
            n = numpy.where(energy > self.break_energy, n * (energy / self.break_energy) ** -self.break_step, n)
        if self.cutoff_energy and self.cutoff == "exponential":
            n = n * numpy.exp(-energy / self.cutoff_energy)
        if self.cutoff_energy and self.cutoff == "sharp":
            n = numpy.where(energy > self.cutoff_energy, 0, n)
        return n

    def special_energies(self):
        energies = []
        if self.break_energy:
            energies.append(self.break_energy)
        if self.cutoff_energy and self.cutoff == "sharp":
            energies.append(self.cutoff_energy)
        return sorted(energies)

    def spectrum(self, slope, sine):
        """Returns energies [GeV], and N(E) dE there."""
        moved = self.aging in ("fixed-pitch", "continuous") or (self.aging == "isotropized" and self.edge == "sharp")
        specials = [numpy.log(e) for e in self.special_energies()]
        if not moved:
            u, w = panels([-9] + specials + [22 if not specials else max(22, specials[-1])], 0.5)
            n = self.injected(numpy.exp(u), slope)
            if self.aging == "isotropized":
                n = n * numpy.exp(-numpy.exp(u) * self.loss(sine) * self.age)
            return numpy.exp(u), n * numpy.exp(u) * w
        top = 1 / (self.loss(sine) * self.age)
        aged = [numpy.log(e / (1 + e / top)) for e in self.special_energies()]
        if self.aging == "continuous":
            ends = sorted(set([-9] + specials + aged + [numpy.log(top)]))
            # towards E_T the spectrum has the singularity (1 - E/E_T)^(s - 1): panels halve there, from both sides
            near = [numpy.log(top) + d for p in range(1, 40) for d in (-(2.0**-p), 2.0**-p)]
            u, w = panels(sorted(ends + near + [22]), 0.5)
            energy = numpy.exp(u)
            n = numpy.array([self.mean_over_ages(e, slope, top) for e in energy])
            return energy, n * energy * w
        # below E_T/2 in ln E, above in ln y
        half = numpy.log(top / 2)
        u, w = panels(sorted(a for a in [-9] + aged + [half] if a <= half), 0.5)
        energy = numpy.exp(u)
        y = 1 - energy / top
        low = (energy, self.injected(energy / y, slope) / y**2 * energy * w)
        ys = sorted([-46, numpy.log(0.5)] + [numpy.log1p(-numpy.exp(a) / top) for a in aged if a > half])
        v, w = panels(ys, 0.5)
        y = numpy.exp(v)
        energy = top * (1 - y)
        high = (energy, self.injected(energy / y, slope) / y**2 * top * y * w)
        return numpy.concatenate([low[0], high[0]]), numpy.concatenate([low[1], high[1]])

    def mean_over_ages(self, energy, slope, top):
        lowest = max(1 - energy / top, 0)
        edges = [numpy.log(max(lowest, 1e-20)), 0]
        edges += [numpy.log(energy / e) for e in self.special_energies() if max(lowest, 1e-20) < energy / e < 1]
        v, w = panels(sorted(edges), 1.0)
        y = numpy.exp(v)
        return top / energy * numpy.sum(self.injected(energy / y, slope) / y**2 * y * w)

    def emissivity(self, slope, hz, polarized=False):
        """int N F dE at each observed frequency, up to constants."""
        kernel = kernel_g if polarized else kernel_f
        hz = numpy.atleast_1d(hz) * (1 + self.redshift)
        if not self.tangled:
            energy, weight = self.spectrum(slope, 1.0)
            return numpy.array([numpy.sum(weight * kernel(nu / (C1 * self.field * energy**2))) for nu in hz])
        total = numpy.zeros(hz.size)
        spectrum = None
        step = 0.125  # 1/2 int da sin^2 a F with sin a = 1/cosh v: the trapezoid rule converges geometrically
        for k in range(80):
            sine = 1 / numpy.cosh(k * step)
            if spectrum is None or self.aging == "fixed-pitch":
                spectrum = self.spectrum(slope, sine)
            energy, weight = spectrum
            factor = step * sine**3 * (0.5 if k == 0 else 1)
            for i, nu in enumerate(hz):
                total[i] += factor * numpy.sum(weight * kernel(nu / (C1 * self.field * sine * energy**2)))
        return total

    def ratio(self, slope, hz, reference, polarized=False):
        """T(nu)/T(nu0)."""
        values = self.emissivity(slope, numpy.append(hz, reference), polarized)
        return values[:-1] / values[-1] * (reference / numpy.asarray(hz)) ** 2

    def index(self, slope, hz, other=None):
        """The local index, from a five-point difference, or the chord."""
        if other:
            pair = self.emissivity(slope, [hz, other])
            return numpy.log(pair[1] / pair[0]) / numpy.log(other / hz) - 2
        h = 0.02
        logs = numpy.log(self.emissivity(slope, hz * numpy.exp(h * numpy.array([-2, -1, 1, 2]))))
        return (8 * (logs[2] - logs[1]) - (logs[3] - logs[0])) / (12 * h) - 2

    def slope(self, index, hz, other=None):
        return optimize.brentq(lambda s: self.index(s, hz, other) - index, 1.02, 6.9, xtol=1e-9)


def check():
    for tangled in (False, True):
        for s in (1.5, 2.5, 3.2):
            law = Law(5.0, tangled=tangled)
            mu = (s - 3) / 2
            moment = 2 ** (mu + 1) / (mu + 2) * special.gamma(mu / 2 + 7 / 3) * special.gamma(mu / 2 + 2 / 3)
            mean = numpy.sqrt(numpy.pi) / 2 * special.gamma((s + 5) / 4) / special.gamma((s + 7) / 4) if tangled else 1
            expected = 0.5 * (1e9 / (C1 * 5)) ** (-(s - 1) / 2) * moment * mean
            found = law.emissivity(s, 1e9)[0]
            assert abs(found / expected - 1) < 1e-7, (tangled, s, found / expected - 1)  # the ends of ln E
            assert abs(law.index(s, 1e9) + (s + 3) / 2) < 1e-7
    # A young enough spectrum is the injected one; a public value of continuous injection: A(1) at s = 2.5, tangled.
    law = Law(3.25, tangled=True, aging="continuous", age=50.0)
    top = 1 / (law.loss(1) * 50)
    nu = C1 * 3.25 * top**2
    ratio = law.emissivity(2.5, nu)[0] / Law(3.25, tangled=True).emissivity(2.5, nu)[0]
    assert abs(ratio / 0.5232257843654 - 1) < 1e-6, ratio


if __name__ == "__main__":
    check()
