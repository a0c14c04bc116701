"""Free parameters: the families of orders 2, 3 and 4 with as many stages, nodes as arguments of a call.

W. Kutta, Z. Math. Phys. 46 (1901) 435-453, found them; J. C. Butcher, Numerical Methods for Ordinary
Differential Equations, section 32, has them with the special cases where nodes coincide.

>>> from newel.methods.families.free_parameters import fourth_order
>>> [str(x) for x in fourth_order("1/3", "2/3").weights]
['1/8', '3/8', '3/8', '1/8']
"""

from __future__ import annotations

from newel.errors import BadRequest
from newel.methods.exact import Exact, ExactLike
from newel.methods.tableau import Tableau

__all__ = [
    "fourth_order",
    "fourth_order_at_end",
    "fourth_order_at_start",
    "fourth_order_equal_nodes",
    "second_order",
    "third_order",
    "third_order_at_start",
    "third_order_equal_nodes",
]

_KUTTA = (
    "W. Kutta, Beitrag zur näherungsweisen Integration totaler Differentialgleichungen, Z. Math. Phys. 46 "
    "(1901) 435-453"
)
Numbers = list[Exact]


def second_order(c2: ExactLike, slug: str = "second-order-2") -> Tableau:
    """Return the method of order 2 with two stages and the node c₂, which is not 0.

    >>> [str(x) for x in second_order("2/3").weights]
    ['1/4', '3/4']
    """
    c2 = _node(c2, "c2", (0,))
    b2 = Exact(1) / (2 * c2)
    return _tableau(slug, 2, [[], [c2]], [1 - b2, b2])


def third_order(c2: ExactLike, c3: ExactLike, slug: str = "third-order-3") -> Tableau:
    """Return the method of order 3 with three stages and these nodes: not 0, not equal, c₂ not 2/3.

    >>> [str(x) for x in third_order("1/2", 1).weights]
    ['1/6', '2/3', '1/6']
    """
    c2 = _node(c2, "c2", (0, "2/3"))
    c3 = _node(c3, "c3", (0, c2))
    b2 = (3 * c3 - 2) / (6 * c2 * (c3 - c2))
    b3 = (2 - 3 * c2) / (6 * c3 * (c3 - c2))
    a32 = 1 / (6 * b3 * c2)
    return _tableau(slug, 3, [[], [c2], [c3 - a32, a32]], [1 - b2 - b3, b2, b3])


def third_order_equal_nodes(b3: ExactLike, slug: str = "third-order-equal-nodes-3") -> Tableau:
    """Return the method of order 3 with c₂ = c₃ = 2/3 and the weight b₃, which is not 0."""
    b3 = _node(b3, "b3", (0,))
    a32 = 1 / (4 * b3)
    two_thirds = Exact.of("2/3")
    rows = [[], [two_thirds], [two_thirds - a32, a32]]
    return _tableau(slug, 3, rows, [Exact.of("1/4"), Exact.of("3/4") - b3, b3])


def third_order_at_start(b3: ExactLike, slug: str = "third-order-at-start-3") -> Tableau:
    """Return the method of order 3 with c₂ = 2/3, c₃ = 0 and the weight b₃, which is not 0."""
    b3 = _node(b3, "b3", (0,))
    a32 = 1 / (4 * b3)
    return _tableau(
        slug, 3, [[], [Exact.of("2/3")], [-a32, a32]], [Exact.of("1/4") - b3, Exact.of("3/4"), b3]
    )


def fourth_order(c2: ExactLike, c3: ExactLike, slug: str = "fourth-order-4") -> Tableau:
    """Return the method of order 4 with four stages and these nodes, c₄ = 1.

    Neither is 0 or 1, they are not equal, c₂ is not 1/2, and 6c₂c₃ − 4(c₂ + c₃) + 3 is not 0.

    >>> [str(x) for x in fourth_order("2/5", "3/5").weights]
    ['11/72', '25/72', '25/72', '11/72']
    """
    c2 = _node(c2, "c2", (0, 1, "1/2"))
    c3 = _node(c3, "c3", (0, 1, c2))
    last = 6 * c2 * c3 - 4 * (c2 + c3) + 3
    b2 = (2 * c3 - 1) / (12 * c2 * (c3 - c2) * (1 - c2))
    b3 = (1 - 2 * c2) / (12 * c3 * (c3 - c2) * (1 - c3))
    b4 = last / (12 * (1 - c2) * (1 - c3))
    if not b4:
        raise _refused("c3", c3, f"with c2 = {c2} it leaves no weight to the last stage")
    a32 = (Exact.of("1/8") - c2 * b2 * (1 - c2) - c3 * b3 * (1 - c3)) / (b3 * c2 * (c3 - 1))
    a43 = b3 * (1 - c3) / b4
    a42 = (b2 * (1 - c2) - b3 * a32) / b4
    rows = [[], [c2], [c3 - a32, a32], [1 - a42 - a43, a42, a43]]
    return _tableau(slug, 4, rows, [1 - b2 - b3 - b4, b2, b3, b4])


def fourth_order_equal_nodes(b3: ExactLike, slug: str = "fourth-order-equal-nodes-4") -> Tableau:
    """Return the method of order 4 with c₂ = c₃ = 1/2 and the weight b₃, not 0; 1/3 gives Kutta's usual one.

    >>> [str(x) for x in fourth_order_equal_nodes("1/3").matrix[3]]
    ['0', '0', '1', '0']
    """
    b3 = _node(b3, "b3", (0,))
    half, sixth, a32 = Exact.of("1/2"), Exact.of("1/6"), 1 / (6 * b3)
    rows = [[], [half], [half - a32, a32], [Exact(0), 1 - 3 * b3, 3 * b3]]
    return _tableau(slug, 4, rows, [sixth, Exact.of("2/3") - b3, b3, sixth])


def fourth_order_at_end(b4: ExactLike, slug: str = "fourth-order-at-end-4") -> Tableau:
    """Return the method of order 4 with c₂ = 1, c₃ = 1/2 and the weight b₄, which is not 0."""
    b4 = _node(b4, "b4", (0,))
    a42, a43 = -1 / (12 * b4), 1 / (3 * b4)
    rows = [[], [Exact(1)], [Exact.of("3/8"), Exact.of("1/8")], [1 - a42 - a43, a42, a43]]
    sixth = Exact.of("1/6")
    return _tableau(slug, 4, rows, [sixth, sixth - b4, Exact.of("2/3"), b4])


def fourth_order_at_start(b3: ExactLike, slug: str = "fourth-order-at-start-4") -> Tableau:
    """Return the method of order 4 with c₂ = 1/2, c₃ = 0 and the weight b₃, which is not 0."""
    b3 = _node(b3, "b3", (0,))
    a32, sixth = 1 / (12 * b3), Exact.of("1/6")
    last = [Exact.of("-1/2") - 6 * b3, Exact.of("3/2"), 6 * b3]
    rows = [[], [Exact.of("1/2")], [-a32, a32], last]
    return _tableau(slug, 4, rows, [sixth - b3, Exact.of("2/3"), b3, sixth])


def _node(value: ExactLike, argument: str, forbidden: tuple[ExactLike, ...]) -> Exact:
    node = Exact.of(value)
    for other in forbidden:
        if node == Exact.of(other):
            raise _refused(
                argument, node, f"it may not be {other}; special cases have functions of their own"
            )
    return node


def _refused(argument: str, value: Exact, why: str) -> BadRequest:
    return BadRequest(f"{argument} = {value}: {why}", argument=argument)


def _tableau(slug: str, order: int, rows: list[Numbers], weights: Numbers) -> Tableau:
    nodes = ", ".join(str(sum(row, Exact(0))) for row in rows[1:])
    return Tableau(
        slug,
        name=f"Kutta's family of order {order} at nodes {nodes}",
        order=order,
        matrix=rows,
        weights=weights,
        authors=["W. Kutta"],
        year=1901,
        source=_KUTTA,
        numbers="derived: from the order conditions, exactly",
    )
