#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Computes the synchrotron kernels with mpmath, from their defining integrals and Bessel functions.

  synchrotron_kernel_reference.py csv           -> stdout: synchrotron_kernel.csv (values to test against)
  synchrotron_kernel_reference.py coefficients  -> stdout: src/physics/synchrotron_kernel_tables.h

Definitions: Rybicki & Lightman 1979, sec. 6.4 (F, G); Crusius & Schlickeiser 1986 (isotropic pitch angles, R).
The csv takes F by quadrature of K_5/3 and R by quadrature of F over the angle; the coefficients take other forms (closed
for R), so that the two do not share a formula.
"""
import sys

import mpmath as mp

mp.mp.dps = 28


def trapezoid(function, x):
    """int_0^inf of an even function that falls as exp(-x cosh u): the trapezoid rule converges geometrically
    (Trefethen & Weideman 2014); the step serves the poles at i pi/2 and the Gaussian of width 1/sqrt(x)."""
    step = min(mp.mpf(1) / 7, mp.mpf(3) / 10 / mp.sqrt(x))
    total, k = function(mp.mpf(0)) / 2, 1
    while x * (mp.cosh(k * step) - 1) < 75:
        total += function(k * step)
        k += 1
    return total * step


def f_closed(x):
    """F(x) = x int_x^inf K_5/3, the order of integration changed."""
    return x * trapezoid(lambda t: mp.exp(-x * mp.cosh(t)) * mp.cosh(5 * t / 3) / mp.cosh(t), x)


def bessel_pair(x):
    y = mp.mpf(x) / 2
    return y, mp.besselk(mp.mpf(4) / 3, y), mp.besselk(mp.mpf(1) / 3, y)


def r_closed(x):
    y, a, b = bessel_pair(x)
    return 2 * y**2 * (a * b - mp.mpf(3) / 5 * y * (a**2 - b**2))


def s_closed(x):
    y, a, b = bessel_pair(x)
    return 2 * y**2 * a * b


def v_closed(x):
    y, a, b = bessel_pair(x)
    return 2 * y**3 * (a**2 + b**2)


def gbar_by_quadrature(x):
    """The mean of sin^2(a) G(x/sin a) over the angle, half of it: no closed form in Bessel functions."""
    # sin a = 1/cosh u, da = du/cosh u
    return trapezoid(lambda u: mp.sech(u) ** 2 * x * mp.besselk(mp.mpf(2) / 3, x * mp.cosh(u)), mp.mpf(x))


# name, function, its power of x in front: e^x f(x) = x^p series(1/x)
TABLES = [
    ("kernel_f", f_closed, mp.mpf(1) / 2),
    ("kernel_g", lambda x: x * mp.besselk(mp.mpf(2) / 3, x), mp.mpf(1) / 2),
    ("bessel_53", lambda x: mp.besselk(mp.mpf(5) / 3, x), -mp.mpf(1) / 2),
    ("kernel_r", r_closed, mp.mpf(0)),
    ("product", s_closed, mp.mpf(1)),
    ("squares", v_closed, mp.mpf(2)),
    ("polarized_r", gbar_by_quadrature, mp.mpf(0)),
]
INTERVALS = [(mp.mpf(0), mp.mpf(1) / 16), (mp.mpf(1) / 16, mp.mpf(1) / 4), (mp.mpf(1) / 4, mp.mpf(1))]


def chebyshev(function, power, low, high, count):
    nodes = [mp.cos(mp.pi * (mp.mpf(k) + mp.mpf(1) / 2) / count) for k in range(count)]
    values = []
    for node in nodes:
        x = 1 / ((low + high) / 2 + (high - low) / 2 * node)
        values.append(mp.exp(x) * function(x) * x**-power)
    coefficients = []
    for j in range(count):
        c = 2 * mp.fsum(v * mp.cos(mp.pi * j * (k + mp.mpf(1) / 2) / count) for k, v in enumerate(values)) / count
        coefficients.append(c / 2 if j == 0 else c)
    last = max(j for j, c in enumerate(coefficients) if abs(c) > mp.mpf("2e-17") * abs(coefficients[0]))
    return coefficients[: last + 1]


def write_coefficients():
    print("// SPDX-License-Identifier: GPL-2.0-or-later")
    print("// Made by tests/oracle/synchrotron_kernel_reference.py coefficients; not for reading.")
    print("#pragma once\n\n#include <array>\n\nnamespace foreglow::synchrotron_tables {\n")
    print("// Chebyshev coefficients in 1/x on [0, 1/16], [1/16, 1/4] and [1/4, 1], of e^x f(x) x^-p.")
    print("inline constexpr int most_terms = 32;")
    print("using Piece = std::array<double, most_terms>;")
    print("struct Table {\n    std::array<int, 3> terms;\n    std::array<Piece, 3> pieces;\n};\n")
    for name, function, power in TABLES:
        pieces = [chebyshev(function, power, low, high, 40) for low, high in INTERVALS]
        assert all(len(piece) <= 32 for piece in pieces), [len(piece) for piece in pieces]
        print(f"// p = {mp.nstr(power, 2)}")
        print(f"inline constexpr Table {name} = {{")
        print("    {" + ", ".join(str(len(piece)) for piece in pieces) + "},")
        print("    {{")
        for piece in pieces:
            print("        {" + ", ".join(mp.nstr(c, 18) for c in piece) + "},")
        print("    }}};\n")
    print("}  // namespace foreglow::synchrotron_tables")


def f_by_quadrature(x):
    k = lambda t: mp.besselk(mp.mpf(5) / 3, t)
    if x > 4:
        scaled = lambda t: k(x + t) * mp.exp(x)  # quad's tolerance is absolute
        return x * mp.exp(-x) * mp.quad(scaled, [0, 1, 3, 8, 20, 70])
    with mp.workdps(50):  # int_0^inf of K_5/3 minus its divergent part is -pi/sqrt(3); the rest by hypergeometric functions
        def antiderivative(nu):  # of I_nu
            half = nu / 2
            return (x / 2) ** (nu + 1) * 2 / ((nu + 1) * mp.gamma(nu + 1)) * mp.hyp1f2(
                half + mp.mpf(1) / 2, half + mp.mpf(3) / 2, nu + 1, x**2 / 4)
        nu = mp.mpf(5) / 3
        return x * mp.pi / mp.sqrt(3) * (antiderivative(-nu) - antiderivative(nu) - 1)


def r_by_quadrature(x):
    return trapezoid(lambda u: mp.sech(u) ** 3 * f_closed(x * mp.cosh(u)), mp.mpf(x))


def write_csv():
    print("# SPDX-License-Identifier: GPL-2.0-or-later")
    print("x,F,G,R,polarized_R")
    points = [mp.mpf(10) ** (mp.mpf(k) / 2) for k in range(-24, 0)]
    points += [mp.mpf(s) for s in "0.003 0.2 0.2858122478458622 0.5 0.9 0.999 1 1.001 1.5 2 3 3.999 4.001 7 10 "
               "15.99 16.01 20 50 100 300 500 699".split()]
    for x in sorted(points):
        row = [x, f_by_quadrature(x), x * mp.besselk(mp.mpf(2) / 3, x), r_by_quadrature(x), gbar_by_quadrature(x)]
        print(",".join(mp.nstr(v, 17) for v in row), flush=True)


if __name__ == "__main__":
    {"csv": write_csv, "coefficients": write_coefficients}[sys.argv[1]]()
