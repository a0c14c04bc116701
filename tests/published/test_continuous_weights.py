"""Published continuous weights and counts of stages, found again by solving the conditions.

Sources, by test: L. F. Shampine, Math. Comp. 46 (1986) 135-150; P. Bogacki and L. F. Shampine, Appl.
Math. Lett. 2 (1989) 321-325; E. Hairer, S. P. Nørsett, G. Wanner, Solving Ordinary Differential Equations I,
II.6 (the values from memory, and each proved); W. H. Enright, K. R. Jackson, S. P. Nørsett, P. G. Thomsen,
ACM Trans. Math. Softw. 12 (1986) 193-218 (bootstrapping); B. Owren and M. Zennaro, Math. Comp. 56 (1991)
645-661 (stage counts, from memory).
"""

from fractions import Fraction

import pytest

import newel
from newel.errors import BadRequest
from newel.methods.completion import continuous_weights, with_end_stage, with_inner_stage

pytestmark = pytest.mark.core


@pytest.fixture(scope="module")
def registry():
    return newel.Registry(cache=None)


def table(text):
    return tuple(tuple(Fraction(x) for x in line.split()) for line in text.strip().splitlines())


def test_bogacki_shampine_1989_the_cubic_hermite_is_the_only_one(registry):
    found = continuous_weights(registry.find("bogacki-shampine-3-2"))
    assert (found.order, found.free, found.smooth) == (3, 0, True)
    assert found.tableau.continuous_weights == table("1 -4/3 5/9\n0 1 -2/3\n0 4/3 -8/9\n0 -1 1")


def test_kuttas_method_of_order_3_without_a_further_stage(registry):
    """Hairer, Nørsett, Wanner I, II.6: b1 = θ − 3θ²/2 + 2θ³/3, b2 = b3 = θ² − 2θ³/3, b4 = −θ²/2 + 2θ³/3."""
    found = continuous_weights(registry.find("kutta-4"))
    assert (found.order, found.free) == (3, 0)
    assert found.tableau.continuous_weights == table("1 -3/2 2/3\n0 1 -2/3\n0 1 -2/3\n0 -1/2 2/3")


SHAMPINE_1986 = table("""
1 -8048581381/2820520608 8663915743/2820520608 -12715105075/11282082432
0 0 0 0
0 131558114200/32700410799 -68118460800/10900136933 87487479700/32700410799
0 -1754552775/470086768 14199869525/1410260304 -10690763975/1880347072
0 127303824393/49829197408 -318862633887/49829197408 701980252875/199316789632
0 -282668133/205662961 2019193451/616988883 -1453857185/822651844
0 40617522/29380423 -110615467/29380423 69997945/29380423
""")


def test_shampine_1986_the_smooth_quartic_of_dormand_and_prince(registry):
    """One parameter is free once the slopes fit; the smallest mean square error is the published choice."""
    found = continuous_weights(registry.find("dormand-prince-5-4"))
    assert (found.order, found.free, found.smooth) == (4, 1, True)
    assert found.tableau.continuous_weights == SHAMPINE_1986


def test_order_4_needs_more_than_kuttas_stages_and_the_rate_at_the_end(registry):
    """With one bootstrapped stage at 1/3 or 2/5 it can be had, at 1/2 it cannot."""
    kutta = registry.find("kutta-4")
    hermite = continuous_weights(kutta, end_stage=True)
    assert hermite.order == 3
    reached = {
        at: continuous_weights(with_inner_stage(hermite.tableau, at)).order for at in ("1/3", "2/5", "1/2")
    }
    assert reached == {"1/3": 4, "2/5": 4, "1/2": 3}


@pytest.mark.parametrize("slug", ["fehlberg-4-5", "cash-karp-5-4"])
def test_six_stage_pairs_reach_order_3_and_order_4_with_the_rate_at_the_end(registry, slug):
    method = registry.find(slug)
    assert continuous_weights(method).order == 3
    with pytest.raises(BadRequest, match="conditions of order 4 cannot be met on its 6 stages"):
        continuous_weights(method, order=4)
    # The continuous solution ends in the weights that are carried on; those of this pair are of order 4 or 5.
    assert continuous_weights(method, end_stage=True).order == 4


def test_dormand_prince_reaches_order_5_with_two_bootstrapped_stages_but_not_with_one(registry):
    quartic = continuous_weights(registry.find("dormand-prince-5-4")).tableau
    one = with_inner_stage(quartic, "1/2")
    assert continuous_weights(one, smooth=False).order == 4
    rows = [
        row + (0,) * (one.stages - quartic.stages) for row in zip(*quartic.continuous_weights, strict=True)
    ]
    import attrs

    carried = attrs.evolve(one, continuous_weights=list(zip(*rows, strict=True)), continuous_order=4)
    two = with_inner_stage(carried, "1/3")
    found = continuous_weights(two, smooth=False)
    assert (found.order, found.free) == (5, 0)


@pytest.mark.parametrize(("stages", "order"), [(1, 1), (2, 2), (3, 2)])
def test_fewest_stages_of_continuous_methods_are_those_of_owren_and_zennaro(registry, stages, order):
    """Order 3 takes 4 stages: none with 3 reaches it, whatever its discrete order."""
    for slug in registry.names():
        method = registry.load(slug)
        if method.stages == stages and method.is_exact:
            assert continuous_weights(method).order <= order
    assert with_end_stage(registry.find("kutta-3")).stages == 4
    assert continuous_weights(registry.find("kutta-3"), end_stage=True).order == 3
