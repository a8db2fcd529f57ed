"""No planted rational point is ever eliminated, whatever the group it is given."""

from __future__ import annotations

import pytest

from tests.support.planted import sweep
from tests.support.sweep import full_sweep


def check(seed: str, curves: int) -> None:
    tally = sweep(seed, curves)
    assert not tally.wrong
    counts = tally.counts
    assert counts["genus 2"] + counts["genus 3"] == curves - sum(
        n for name, n in counts.items() if name.startswith("refused: ")
    )
    # the sweep did what it is for: planted points met the sieve, random ones died in it
    assert counts["point open"] + counts["disc open"] + counts["coefficients open"] >= curves
    assert counts["random eliminated"] >= curves // 2
    assert counts["logarithms"] >= 4 * curves
    accepted = sum(n for name, n in counts.items() if name.endswith(": accepted"))
    refused = sum(n for name, n in counts.items() if name.endswith(": refused"))
    assert accepted > 0 and refused > 0


@pytest.mark.parametrize("block", range(10))
def test_planted_points_survive(block: int) -> None:
    check(f"block {block}", 15)


@pytest.mark.slow
@pytest.mark.parametrize("block", range(10, 30))
def test_planted_points_survive_at_length(block: int) -> None:
    check(f"block {block}", 100 if full_sweep() else 10)
