"""Alpha rules on functions whose derivatives are known in closed form."""

import numpy as np
import pytest

from eosmuster.diagnose.alphas import LOWEST, breaches

SOAVE_M = 0.6


def soave(tr: np.ndarray) -> np.ndarray:
    return (1.0 + SOAVE_M * (1.0 - np.sqrt(tr))) ** 2


def test_soave_turns_up_where_its_root_is_zero() -> None:
    """alpha' = 0 at Tr = (1 + 1/m)**2; alpha'' > 0 and alpha''' < 0 everywhere."""
    [breach] = breaches(soave)
    assert breach.rule == "falling"
    assert breach.from_reduced == pytest.approx((1 + 1 / SOAVE_M) ** 2, abs=0.02)


def test_a_consistent_function_breaks_nothing() -> None:
    """exp(0.5 (1 - Tr)): all derivatives alternate in sign."""
    assert breaches(lambda tr: np.exp(0.5 * (1.0 - tr))) == ()


def test_a_constant_only_fails_to_fall() -> None:
    assert [b.rule for b in breaches(np.ones_like)] == ["falling"]


@pytest.mark.parametrize(
    ("function", "rule"),
    [
        (lambda tr: 2.0 - tr, "positive"),
        (lambda tr: 3.0 - 0.02 * tr**2, "convex"),
        (lambda tr: 30.0 - 3.0 * tr + 0.1 * tr**2 + 0.005 * tr**3, "third derivative negative"),
        (lambda tr: np.where(tr < 5.0, np.exp(-tr), np.exp(-tr) - 1e-3), "continuous"),
    ],
)
def test_each_rule_is_seen(function, rule) -> None:
    assert rule in [b.rule for b in breaches(function)]


def test_the_first_stretch_ends_where_the_rule_holds_again() -> None:
    """sin wiggles on a falling line: it rises where cos > 0.5."""
    wiggle = [b for b in breaches(lambda tr: 20.0 - tr + 2.0 * np.sin(tr), 9.0) if b.rule == "falling"]
    assert wiggle[0].from_reduced == LOWEST
    assert wiggle[0].to_reduced == pytest.approx(np.pi / 3, abs=0.02)


def jet(excess: float, first: float, second: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    return tuple(np.asarray(x) for x in (excess, first, second))


@pytest.mark.parametrize(
    ("first", "second", "said"),
    [
        (-0.5, -0.25, None),  # exp(0.5 (1 - Tr)) itself: alpha' = -1/2, alpha'' = 1/4
        (-0.5 - 1e-5, -0.25, None),  # constants printed to five digits
        (-0.52, -0.27, "alpha' jumps by -0.02, from -0.5 to -0.52"),
        (-0.5, 0.0, "alpha'' jumps by +0.25, from 0.25 to 0.5"),
        (-0.52, 0.0, "alpha' jumps by -0.02, from -0.5 to -0.52; alpha'' jumps by +0.27, from 0.25 to 0.52"),
    ],
)
def test_what_jumps_at_a_joint_is_said_with_its_size(first: float, second: float, said: str | None) -> None:
    """Both sides go on as exp(0.5 (1 - Tr)) within the grid, so the joint is the only thing that can be reported."""
    joints = {1.0: (jet(0.0, -0.5, -0.25), jet(0.0, first, second))}
    found = breaches(lambda tr: np.exp(0.5 * (1.0 - tr)), joints=joints)
    assert [(b.rule, b.from_reduced, b.to_reduced, b.what) for b in found] == (
        [("continuous", 1.0, 1.0, said)] if said else []
    )


def test_a_kink_is_told_as_one_and_not_as_a_want_of_convexity() -> None:
    """exp of two slopes that meet at Tr = 1: differences across the kink would read it as a curvature."""

    def kinked(tr: np.ndarray) -> np.ndarray:
        return np.exp(np.where(tr < 1.0, 0.5, 0.6) * (1.0 - tr))

    assert "convex" in [b.rule for b in breaches(kinked)]
    [breach] = breaches(kinked, joints={1.0: (jet(0.0, -0.5, -0.25), jet(0.0, -0.6, -0.24))})
    assert breach.what.startswith(
        "alpha' jumps by -0.1, from -0.5 to -0.6; alpha'' jumps by +0.11, from 0.25 to 0.36"
    )
