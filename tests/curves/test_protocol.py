"""The curve models have everything that the layers above ask for, with the same argument names."""

from __future__ import annotations

import inspect
from typing import Any

import pytest

from sieve.curves.discs import ResidueDisc
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.hyperelliptic_mod import ReducedHyperelliptic
from sieve.curves.plane import PlaneCurve
from sieve.curves.plane_mod import ReducedPlane
from sieve.curves.protocol import Curve, Disc, ReducedCurve

CURVE = HyperellipticCurve([1, -2, 1, 2, 2, 4, 1])
REDUCED = CURVE.modulo(7)
DISC = ResidueDisc(CURVE.rows, CURVE.weight, CURVE.degree, 7, REDUCED.points[0], 0)


PLANE = PlaneCurve({(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1})
REDUCED_PLANE = PLANE.modulo(5)
PLANE_DISC = ResidueDisc(PLANE.rows, PLANE.weight, PLANE.degree, 5, REDUCED_PLANE.points[-1], 0)


def static_check() -> tuple[Curve, ReducedCurve, Disc, Curve, ReducedCurve]:
    """The type checker compares the signatures here."""
    return CURVE, REDUCED, DISC, PLANE, REDUCED_PLANE


@pytest.mark.parametrize(
    ("protocol", "instance"),
    [
        (Curve, CURVE), (ReducedCurve, REDUCED), (Disc, DISC),
        (Curve, PLANE), (ReducedCurve, REDUCED_PLANE), (Disc, PLANE_DISC),
    ],
    ids=["Curve", "ReducedCurve", "Disc", "PlaneCurve", "ReducedPlane", "PlaneDisc"],
)
def test_members(protocol: Any, instance: Any) -> None:
    wanted = set(protocol.__annotations__) | {
        name for name, value in vars(protocol).items()
        if not name.startswith("_") and (inspect.isfunction(value) or isinstance(value, property))
    }
    assert wanted
    for name in wanted:
        assert hasattr(instance, name), name
        asked = vars(protocol).get(name)
        if inspect.isfunction(asked):
            given = list(inspect.signature(getattr(instance, name)).parameters)
            expected = list(inspect.signature(asked).parameters)[1:]
            assert given[: len(expected)] == expected, name


def test_classes() -> None:
    assert isinstance(REDUCED, ReducedHyperelliptic)
    assert REDUCED.points_per_section == CURVE.genus + 2
    assert isinstance(REDUCED_PLANE, ReducedPlane) and REDUCED_PLANE.points_per_section == 2
