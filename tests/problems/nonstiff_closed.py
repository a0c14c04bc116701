"""Closed forms of the 1972 non-stiff problems, in mpmath's arithmetic.

Each is derived from the equations themselves; the line beside it says how. B1, C5, E2 and E3 have none.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

__all__ = [
    "a1",
    "a2",
    "a3",
    "a4",
    "a5",
    "b2",
    "b3",
    "b4",
    "b5",
    "c1",
    "c2",
    "c3",
    "c4",
    "e1",
    "e4",
    "e5",
    "orbit",
]


def a1(t: Any) -> list[Any]:
    from mpmath import exp

    return [exp(-t)]


def a2(t: Any) -> list[Any]:
    from mpmath import sqrt

    return [1 / sqrt(t + 1)]


def a3(t: Any) -> list[Any]:
    from mpmath import exp, sin

    return [exp(sin(t))]


def a4(t: Any) -> list[Any]:
    from mpmath import exp

    return [20 / (1 + 19 * exp(-t / 4))]


def a5(t: Any) -> list[Any]:
    """In polar coordinates the curve is a logarithmic spiral: ln r + angle is constant."""
    from mpmath import atan2, findroot, log, mpf, pi, sqrt

    guess = 4 - t * mpf("0.24")
    return [findroot(lambda y: log(sqrt(t * t + y * y)) + atan2(y, t) - log(4) - pi / 2, guess)]


def b2(t: Any) -> list[Any]:
    """The symmetric matrix has eigenvalues 0, -1 and -3."""
    from mpmath import exp

    slow, fast = exp(-t) / 2, exp(-3 * t) / 2
    return [1 + slow + fast, 1 - 2 * fast, 1 - slow + fast]


def b3(t: Any) -> list[Any]:
    """y2 = u'/u with u'' = exp(-t) u, which modified Bessel functions solve; the sum is constant."""
    from mpmath import besseli, besselk, exp, mpf

    def pieces(time: Any) -> tuple[Any, Any, Any, Any]:
        x = 2 * exp(-time / 2)
        slope = -x / 2
        return besseli(0, x), besselk(0, x), besseli(1, x) * slope, -besselk(1, x) * slope

    _, _, i_slope, k_slope = pieces(mpf(0))
    i, k, di, dk = pieces(t)
    a = exp(-t)
    b = (k_slope * di - i_slope * dk) / (k_slope * i - i_slope * k)
    return [a, b, 1 - a - b]


def b4(t: Any) -> list[Any]:
    """In cylinder coordinates the angle is t, the height sin t and the radius 2 + cos t."""
    from mpmath import cos, sin

    radius = 2 + cos(t)
    return [radius * cos(t), radius * sin(t), sin(t)]


def b5(t: Any) -> list[Any]:
    """Jacobi's elliptic functions with parameter m = 0.51."""
    from mpmath import ellipfun, mpf

    return [ellipfun(kind, t, m=mpf("0.51")) for kind in ("sn", "cn", "dn")]


def c1(t: Any) -> list[Any]:
    """Poisson's distribution; what is not in the first nine is in the last."""
    from mpmath import exp, factorial

    head = [exp(-t) * t**i / factorial(i) for i in range(9)]
    return [*head, 1 - sum(head)]


def c2(t: Any) -> list[Any]:
    """The geometric distribution of a pure birth process."""
    from mpmath import exp

    decay = exp(-t)
    return [*(decay * (1 - decay) ** i for i in range(9)), (1 - decay) ** 9]


def _diffusion(t: Any, size: int) -> list[Any]:
    """The matrix has the sines as eigenvectors."""
    from mpmath import cos, exp, pi, sin

    angles = [k * pi / (size + 1) for k in range(1, size + 1)]
    parts = [2 * sin(angle) * exp(-2 * (1 - cos(angle)) * t) / (size + 1) for angle in angles]
    both = list(zip(parts, angles, strict=True))
    return [sum(part * sin(j * angle) for part, angle in both) for j in range(1, size + 1)]


def c3(t: Any) -> list[Any]:
    return _diffusion(t, 10)


def c4(t: Any) -> list[Any]:
    return _diffusion(t, 51)


def orbit(eccentricity: str) -> Callable[[Any], list[Any]]:
    """Kepler's problem: E - e sin E = t gives the eccentric anomaly E."""

    def closed(t: Any) -> list[Any]:
        from mpmath import cos, eps, mpf, sin, sqrt

        e = mpf(eccentricity)
        anomaly = t
        for _ in range(400):
            change = (anomaly - e * sin(anomaly) - t) / (1 - e * cos(anomaly))
            anomaly -= change / (1 + abs(change))
            if abs(change) < 100 * eps:
                break
        minor, pace = sqrt(1 - e * e), 1 - e * cos(anomaly)
        return [cos(anomaly) - e, minor * sin(anomaly), -sin(anomaly) / pace, minor * cos(anomaly) / pace]

    return closed


def e1(t: Any) -> list[Any]:
    """J of order 1/2 at t + 1 is sqrt(2/(pi x)) sin x."""
    from mpmath import cos, pi, sin, sqrt

    x = t + 1
    scale = sqrt(2 / (pi * x))
    return [scale * sin(x), scale * (cos(x) - sin(x) / (2 * x))]


def e4(t: Any) -> list[Any]:
    """The speed is a hyperbolic tangent that tends to sqrt(0.08)."""
    from mpmath import cosh, log, mpf, sqrt, tanh

    drag, last = mpf("0.4"), sqrt(mpf("0.08"))
    return [30 + log(cosh(drag * last * t)) / drag, last * tanh(drag * last * t)]


def e5(t: Any) -> list[Any]:
    """The slope is sinh(ln(25/(25 - t)))."""
    from mpmath import log

    left = 25 - t
    return [25 * log(25 / left) / 2 - (625 - left * left) / 100, (25 / left - left / 25) / 2]
