"""A slice of the generated sound designs is quiet; tests/bench/quiet.py runs a thousand."""

import pytest

from tests.faults.generated import draw
from tests.faults.verdict import loud, reviewed

SLICES = 6
EACH = 12
FALSE_ALARMS = 0


def test_a_seed_makes_the_same_design_each_time():
    """The seed alone says what comes out, and other seeds make other designs."""
    assert draw(7) == draw(7)
    assert len({draw(seed).text for seed in range(20)}) == 20


@pytest.mark.parametrize("number", range(SLICES))
def test_generated_sound_designs_are_quiet(number):
    """No critical and no major, and stages were judged."""
    heard = []
    for seed in range(number * EACH, (number + 1) * EACH):
        design = draw(seed)
        review = reviewed(design.text)
        assert review.design.stages
        assert review.judged > 5 * review.open
        heard += [f"{design.name}: {finding.message}" for finding in loud(review)]
    assert len(heard) <= FALSE_ALARMS, heard


def test_a_swing_that_only_arithmetic_leaves_is_none():
    """An output at rest swung by 1e-15 V, of which its bias current moved it a million times."""
    design = draw(30273)
    found = reviewed(design.text)
    assert not loud(found)
    spans = [s.output.demand.span for s in found.design.stages]
    assert not [span for span in spans if span is not None and 0 < span < 1e-9]
