"""A third-order method worked out in Python from its two free nodes."""

from fractions import Fraction

from newel.methods.tableau import Tableau


def winding() -> Tableau:
    """Return the three-stage method with nodes 1/4 and 3/4.

    The four conditions of order three leave the nodes u and v free; the weights follow from the two linear
    ones, and a32 from b3 a32 c2 = 1/6. The embedded weights (1 − θ, θ, 0) with θ = 1/(2u) are of order two.

    Example:
        >>> winding().order
        3
    """
    u, v = Fraction(1, 4), Fraction(3, 4)
    b2 = (2 - 3 * v) / (6 * u * (u - v))
    b3 = (2 - 3 * u) / (6 * v * (v - u))
    a32 = 1 / (6 * b3 * u)
    theta = 1 / (2 * u)
    return Tableau(
        "winding-3",
        name="Winding",
        order=3,
        matrix=[[], [u], [v - a32, a32]],
        weights=[1 - b2 - b3, b2, b3],
        embedded_weights=[1 - theta, theta, 0],
        embedded_order=2,
        numbers="derived: from the conditions of order three",
    )
