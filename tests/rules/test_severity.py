"""How bad a broken limit is: the table, the softening by size, the cap."""

import pytest

from railguard.analysis.bound import Pair
from railguard.rules.severity import TABLE, breach, capped, evidence, far_beyond, soften
from tests.rules.stages import bound


@pytest.mark.parametrize(
    ("bases", "column"),
    [
        (("netlist", "catalogue"), "stated"),
        (("user", "catalogue"), "stated"),
        (("netlist", "memory"), "memory"),
        (("memory", "assumed"), "assumed"),
        (("netlist", "practice"), "assumed"),
    ],
)
def test_the_weakest_basis_counts(bases, column):
    """A judgement is as good as the least trusted number in it."""
    assert evidence(*bases) == column


@pytest.mark.parametrize(
    ("fields", "basis", "severity"),
    [
        ({"absolute": 9.0}, "catalogue", "critical"),
        ({"absolute": 9.0, "absolute_basis": "memory"}, "memory", "critical"),
        ({"absolute": 9.0, "absolute_basis": "assumed"}, "catalogue", "minor"),
        ({"typical": 9.0}, "catalogue", "critical"),
        ({"typical": 9.0}, "memory", "major"),
        ({"typical": 9.0}, "practice", "minor"),
        ({"guaranteed": 9.0}, "catalogue", "major"),
        ({"guaranteed": 9.0}, "memory", "minor"),
        ({"guaranteed": 9.0}, "practice", "minor"),
        ({"guaranteed": 11.0, "stated": Pair(12.0, 11.0)}, "catalogue", "major"),
        ({"guaranteed": 11.0, "stated": Pair(12.0, 11.0)}, "memory", "minor"),
        ({"guaranteed": 11.0, "default": Pair(12.0, 11.0)}, "catalogue", "minor"),
        ({"guaranteed": 11.0, "default": Pair(12.0, 11.0)}, "practice", "remark"),
    ],
)
def test_the_table(fields, basis, severity):
    """Ten volts against each sort of limit, with each sort of evidence."""
    broken = breach(bound(demand=10.0, typical_basis=basis, guaranteed_basis=basis, **fields))
    assert broken is not None
    assert broken.severity == severity


def test_an_assumed_demand_is_minor_whatever_the_limit():
    """A demand that rests on an assumption never makes more than a minor finding."""
    broken = breach(bound(demand=10.0, typical=1.0, demand_basis="assumed"))
    assert broken is not None
    assert broken.severity == "minor"


def test_a_corner_without_a_guaranteed_figure_rests_on_the_typical_one():
    """Where nothing is guaranteed the corner's limit is as good as the typical figure."""
    broken = breach(
        bound(
            demand=8.0, typical=9.0, typical_basis="memory", guaranteed_basis="catalogue",
            stated=Pair(9.5, 9.0),
        )
    )  # fmt: skip
    assert broken is not None
    assert broken.severity == "minor"
    assert broken.limit_basis == "memory"
    assert broken.at_corner


def test_a_corner_rests_on_the_guaranteed_figure_where_there_is_one():
    """How well the typical one is known plays no part."""
    broken = breach(
        bound(
            demand=8.0, typical=10.0, typical_basis="memory", guaranteed=9.0,
            guaranteed_basis="catalogue", stated=Pair(9.5, 9.0),
        )
    )  # fmt: skip
    assert broken is not None
    assert (broken.severity, broken.limit_basis) == ("major", "catalogue")


def test_a_corner_is_not_softened_by_size():
    """Half a per cent of the span at a corner of stated tolerances: the row of the table stands."""
    broken = breach(bound(demand=8.0, guaranteed=9.0, stated=Pair(9.1, 9.0), level=0.0, span=20.0))
    assert broken is not None
    assert broken.severity == "major"


def test_a_kept_limit_is_no_breach():
    """A demand inside every limit breaks none."""
    assert breach(bound(demand=5.0, typical=10.0, guaranteed=9.0, absolute=12.0)) is None


def test_the_limit_itself_is_kept():
    """A demand equal to its limit, but for rounding, is inside."""
    assert breach(bound(demand=9.0 * (1 + 1e-12), guaranteed=9.0)) is None
    assert breach(bound(False, demand=0.0, guaranteed=0.0)) is None
    assert breach(bound(demand=9.0 * (1 + 1e-6), guaranteed=9.0)) is not None


def test_no_demand_is_no_breach():
    """What was not worked out breaks nothing."""
    assert breach(bound(typical=1.0)) is None


def test_the_worst_of_several_limits_leads():
    """Beyond the typical and the guaranteed limit, the graver of the two is told."""
    broken = breach(bound(demand=10.0, typical=9.5, guaranteed=8.0, span=20.0, level=0.0))
    assert broken is not None
    # 0.5 V beyond typical is 2.5 % of the span: major; 2 V beyond guaranteed: major; the
    # typical limit leads among equals
    assert (broken.broken, broken.severity) == ("typical", "major")


def test_a_lower_side_is_broken_from_above():
    """A low limit is broken by what goes below it."""
    assert breach(bound(False, demand=-5.0, typical=-9.0)) is None
    broken = breach(bound(False, demand=-10.0, typical=-9.0))
    assert broken is not None
    assert broken.margin == pytest.approx(-1.0)


@pytest.mark.parametrize(
    ("overrun", "severity"),
    [
        (0.19, "minor"),
        (0.2, "major"),
        (0.21, "major"),
        (0.99, "major"),
        (1.0, "critical"),
        (1.01, "critical"),
    ],
)
def test_softening_by_size(overrun, severity):
    """Below 2 % of the span minor, below 10 % at most major, beyond as the table says."""
    assert soften("critical", overrun, 10.0, level_outside=False) == severity


def test_softening_never_makes_worse():
    """A remark stays a remark, and a minor one minor."""
    assert soften("remark", 0.5, 10.0, level_outside=False) == "remark"
    assert soften("minor", 9.0, 10.0, level_outside=False) == "minor"


def test_no_softening_where_the_level_is_outside_or_there_is_no_span():
    """A small overrun counts in full where the DC level itself is beyond, or nothing moves."""
    assert soften("critical", 0.1, 10.0, level_outside=True) == "critical"
    assert soften("critical", 0.1, None, level_outside=False) == "critical"
    assert soften("critical", 0.1, 0.0, level_outside=False) == "critical"


def test_the_level_outside_keeps_its_weight():
    """A stage whose DC level stands beyond the limit is not softened by a wide signal."""
    inside = breach(bound(demand=10.1, typical=10.0, level=0.0, span=20.0))
    outside = breach(bound(demand=10.1, typical=10.0, level=10.05, span=20.0))
    assert inside is not None
    assert outside is not None
    assert (inside.severity, outside.severity) == ("minor", "critical")


@pytest.mark.parametrize("level", [9.5, 10.0])
def test_a_level_just_inside_the_limit_or_on_it_is_not_outside(level):
    """A tenth of a volt more than the limit is still half a per cent of the span."""
    broken = breach(bound(demand=10.1, typical=10.0, level=level, span=20.0))
    assert broken is not None
    assert broken.severity == "minor"


def test_zero_scale_on_a_single_supply_is_softened():
    """A sensor at zero rests on the rail: 20 mV of 5 V are no catastrophe."""
    resting = bound(False, demand=0.0, level=0.0, typical=0.02, absolute=0.0)
    alone = breach(resting)
    told = breach(resting, scale=5.0)
    assert alone is not None
    assert told is not None
    assert (alone.severity, told.severity) == ("critical", "minor")


def test_a_classic_output_at_ground_is_no_zero_scale():
    """Two volts of a 12 V supply are too much to call zero scale."""
    broken = breach(bound(False, demand=0.0, level=0.0, typical=2.0, absolute=0.0), scale=12.0)
    assert broken is not None
    assert broken.severity == "critical"


def test_zero_scale_counts_only_on_the_rail_and_at_the_lower_end():
    """A level between rail and limit, or at the upper rail, keeps its weight."""
    between = breach(bound(False, demand=0.01, level=0.01, typical=0.02, absolute=0.0), scale=5.0)
    upper = breach(bound(True, demand=5.0, level=5.0, typical=4.98, absolute=5.0), scale=5.0)
    assert between is not None
    assert upper is not None
    assert (between.severity, upper.severity) == ("critical", "critical")


def test_reserve_is_measured_at_the_guaranteed_limit():
    """Room left is positive in a reserve finding, and enough of it is no finding."""
    used = breach(bound(demand=8.9, typical=10.0, guaranteed=9.0), 0.5)
    assert used is not None
    assert (used.broken, used.severity) == ("reserve", "minor")
    assert used.margin == pytest.approx(0.1)
    assert breach(bound(demand=8.5, typical=10.0, guaranteed=9.0), 0.5) is None


def test_reserve_falls_back_on_the_typical_limit():
    """Where nothing is guaranteed the reserve is measured at the typical limit."""
    used = breach(bound(demand=9.9, typical=10.0), 0.5)
    assert used is not None
    assert used.broken == "reserve"


def test_a_cap_holds_the_severity_down():
    """A device nobody knows makes no more than a minor finding, and a remark stays one."""
    broken = breach(bound(demand=20.0, absolute=12.0), cap="minor")
    assert broken is not None
    assert broken.severity == "minor"
    assert capped("remark", "minor") == "remark"


def test_numbers_are_those_compared():
    """Demand, limit, margin, share and basis are those of the limit that is told."""
    broken = breach(bound(demand=12.4, typical=10.5, span=24.8, level=0.0))
    assert broken is not None
    assert (broken.demand, broken.limit) == (12.4, 10.5)
    assert broken.margin == pytest.approx(-1.9)
    assert broken.share == pytest.approx(-1.9 / 24.8)
    assert broken.basis == ("netlist", "catalogue")


def test_better_evidence_is_never_milder():
    """Along each row the severity does not grow as the evidence gets worse."""
    order = ["critical", "major", "minor", "remark"]
    for row in TABLE.values():
        ranks = [order.index(row[column]) for column in ("stated", "memory", "assumed")]
        assert ranks == sorted(ranks)


@pytest.mark.parametrize(
    ("fields", "basis", "severity"),
    [
        ({"demand": 20.1, "guaranteed": 10.0}, "catalogue", "critical"),
        ({"demand": 20.1, "guaranteed": 10.0}, "memory", "major"),
        ({"demand": 20.1, "guaranteed": 10.0}, "practice", "minor"),
        ({"demand": 20.0, "guaranteed": 10.0}, "catalogue", "major"),
        ({"demand": 20.1, "guaranteed": 10.0, "typical": 25.0}, "catalogue", "major"),
        ({"demand": 9.0, "guaranteed": 10.0, "stated": Pair(25.0, 10.0)}, "catalogue", "major"),
    ],
)
def test_far_beyond_what_is_guaranteed(fields, basis, severity):
    """Twice the guaranteed limit, at nominal and with none typical, is as bad as a typical one."""
    limits = bound(typical_basis=basis, guaranteed_basis=basis, **fields)
    broken = breach(limits)
    assert broken is not None
    assert far_beyond(limits, broken, 2.0).severity == severity
    assert far_beyond(limits, broken, 1e9) == broken


def test_zero_scale_stands_on_whatever_the_lower_rail_is():
    """At -5 V as at ground."""
    resting = bound(False, demand=-5.0, level=-5.0, typical=-4.98, absolute=-5.0)
    broken = breach(resting, scale=5.0)
    assert broken is not None
    assert broken.severity == "minor"


@pytest.mark.parametrize(("level", "severity"), [(0.005, "minor"), (0.02, "critical")])
def test_zero_scale_is_a_thousandth_of_the_span(level, severity):
    """5 mV of 10 V rest on the rail, 20 mV do not."""
    resting = bound(False, demand=0.0, level=level, span=10.0, typical=0.05, absolute=0.0)
    broken = breach(resting, scale=5.0)
    assert broken is not None
    assert broken.severity == severity


def test_what_nothing_moves_and_does_not_rest_is_measured_against_nothing():
    """A level that is not known rests on no rail, so a small excess is not softened by size."""
    unknown = breach(bound(False, demand=0.0, typical=0.02, absolute=0.0), scale=5.0)
    assert unknown is not None
    assert unknown.severity == "critical"


@pytest.mark.parametrize(("demand", "row"), [(-2e-16, "typical"), (-1e-6, "absolute")])
def test_what_arithmetic_leaves_of_zero_is_at_the_rail(demand, row):
    """Of a span of 2.5 V: zero is short of what the output reaches, and not below its rail."""
    one = bound(
        False, demand=demand, level=1.25, span=2.5, absolute=0.0, typical=0.006, guaranteed=None
    )
    assert breach(one).broken == row
