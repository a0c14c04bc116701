"""A family: second-order methods of any number of stages, each of the same length."""

from fractions import Fraction

from newel.errors import BadRequest
from newel.methods.tableau import Tableau

MOST = 40


def even_stairs(stages: int) -> Tableau:
    """Return the member with so many stages: every a_ij is 1/(s − 1), every weight 1/s.

    Order two: Σb = 1, and Σ b_i c_i = (1/s) Σ (i − 1)/(s − 1) = 1/2.

    Raises:
        BadRequest: unless there are 2 to 40 stages.

    Example:
        >>> even_stairs(3).slug
        'even-stairs-2-stages-3'
    """
    if not 2 <= stages <= MOST:
        raise BadRequest(f"even-stairs-2-stages-{stages}: stages must be from 2 to {MOST}", argument="stages")
    step, weight = Fraction(1, stages - 1), Fraction(1, stages)
    return Tableau(
        f"even-stairs-2-stages-{stages}",
        name=f"Even stairs of {stages}",
        order=2,
        matrix=[[step] * row for row in range(stages)],
        weights=[weight] * stages,
        numbers="derived",
    )
