"""One cause is one finding, with what follows from it hanging under it."""

import pytest

from railguard.analysis.loop import Feedback
from railguard.analysis.stage import Output
from railguard.devices.model import SwingPoint
from railguard.location import Location
from railguard.rules.causes import merge, order
from railguard.rules.compose import finding
from railguard.rules.links import Link
from railguard.rules.relations import elements_of, upstream
from tests.rules.stages import (
    FAMILY,
    capacitor,
    changed,
    design,
    high,
    low,
    pin,
    rail,
    resistor,
    stage,
    voltage_source,
)


def about(rule, *designators, severity="major", nets=(), demand=None, limit=None, margin=None):
    """Make a finding with what merging looks at."""
    return finding(
        rule, severity, rule, designators=designators, nets=nets, demand=demand, limit=limit,
        margin=margin,
    )  # fmt: skip


def tree(found):
    """Return findings as (rule, designators) with the rules of what hangs under each."""
    return [
        (f.rule, f.designators, [(c.rule, c.designators, c.cause) for c in f.consequences])
        for f in found
    ]


def rules(found):
    """Return the rules of the findings on top, and of those that hang, sorted."""
    return [f.rule for f in found], sorted(c.rule for f in found for c in f.consequences)


ONE = design(stage())
CHAIN = design(
    stage("XU1"), stage("XU2", after=("XU1",)), stage("XU3", after=("XU2",)), stage("XU4")
)


def test_findings_without_a_common_cause_stay_apart():
    """Two unrelated faults are two findings, worst first."""
    found = merge([about("decoupling-few", severity="minor"), about("headroom-output", "XU1")], ONE)
    assert rules(found) == (["headroom-output", "decoupling-few"], [])


@pytest.mark.parametrize(
    ("cause", "follows"),
    [
        ("supply-missing", "headroom-output"),
        ("supply-missing", "drive-current"),
        ("supply-missing", "supply-range"),
        ("supply-missing", "decoupling-absent"),
        ("supply-reversed", "supply-package-split"),
        ("feedback-high", "headroom-offset"),
        ("supply-reversed", "headroom-input"),
        ("supply-reversed", "stability-phase-margin"),
        ("feedback-reversed", "headroom-output"),
        ("feedback-reversed", "bias-no-dc-path"),
        ("feedback-open", "drive-current"),
        ("feedback-open", "bias-no-dc-path"),
        ("bias-no-dc-path", "headroom-input"),
        ("drive-joined", "drive-current"),
        ("drive-tied", "headroom-output"),
        ("drive-tied", "stability-load-capacitance"),
        ("drive-joined", "feedback-open"),
        ("feedback-high", "stability-phase-margin"),
        ("feedback-high", "bias-current-error"),
        ("headroom-input", "headroom-phase-reversal"),
        ("headroom-input", "drive-input-above-rail"),
        ("headroom-output", "headroom-offset"),
        ("drive-current", "bias-current-error"),
        ("feedback-low", "headroom-offset"),
        ("dynamics-loop-gain", "dynamics-slew"),
        ("supply-missing", "supply-package-split"),
    ],
)
def test_what_follows_on_the_same_stage_hangs_under_its_cause(cause, follows):
    """The consequence says what it has in common with its cause, and the cause alone stands."""
    pair = [about(follows, "XU1"), about(cause, "XU1", severity="critical")]
    assert tree(merge(pair, ONE)) == [(cause, ("XU1",), [(follows, ("XU1",), "XU1")])]


@pytest.mark.parametrize(
    ("cause", "other"),
    [
        ("supply-missing", "feedback-open"),
        ("supply-missing", "bias-no-dc-path"),
        ("feedback-reversed", "supply-range"),
        ("headroom-input", "decoupling-few"),
    ],
)
def test_faults_that_would_remain_stay_on_top(cause, other):
    """What would still be wrong once the cause is mended is a finding of its own."""
    pair = [about(other, "XU1", nets=("+12V",)), about(cause, "XU1", nets=("+12V",))]
    assert sorted(f.rule for f in merge(pair, ONE)) == sorted([cause, other])


def test_other_stages_are_not_consequences():
    """A broken stage says nothing of a stage it does not reach."""
    found = merge(
        [about("feedback-open", "XU1", severity="critical"), about("headroom-output", "XU4")],
        CHAIN,
    )
    assert rules(found)[1] == []


def test_everything_on_a_dead_rail_hangs_under_it():
    """One dead rail, three stages, one finding."""
    found = merge(
        [
            about("headroom-output", "XU1"),
            about("headroom-output", "XU2"),
            about("drive-current", "XU3"),
            about("supply-name-disagrees", "U1", nets=("+12V",)),
            about("supply-missing", "XU1", "XU2", "XU3", severity="critical", nets=("+12V",)),
        ],
        CHAIN,
    )
    assert [f.rule for f in found] == ["supply-missing"]
    assert len(found[0].consequences) == 4


def test_ground_relates_nothing():
    """Two findings that share net 0 have nothing in common by that."""
    found = merge(
        [
            about("supply-name-disagrees", "U9", nets=("0",)),
            about("supply-missing", "XU1", nets=("0",)),
        ],
        ONE,
    )
    assert len(found) == 2


def test_a_saturated_stage_takes_those_behind_it_along():
    """Headroom of every later stage hangs under the first that clips, flat."""
    found = merge(
        [
            about("headroom-output", "XU3", severity="critical"),
            about("headroom-input", "XU2", severity="critical"),
            about("headroom-output", "XU1", severity="critical"),
        ],
        CHAIN,
    )
    (cause,) = found
    assert cause.designators == ("XU1",)
    assert sorted(c.designators for c in cause.consequences) == [("XU2",), ("XU3",)]
    assert {c.cause for c in cause.consequences} == {"XU1"}


def test_a_stage_that_clips_a_little_explains_nothing():
    """Under a minor finding nothing of a later stage hangs."""
    found = merge(
        [about("headroom-output", "XU1", severity="minor"), about("headroom-output", "XU2")],
        CHAIN,
    )
    assert rules(found)[1] == []


def test_a_stage_that_does_not_work_takes_later_headroom_along():
    """Behind an open loop the levels mean nothing; other faults there stay."""
    found = merge(
        [
            about("feedback-open", "XU1", severity="critical"),
            about("headroom-output", "XU3"),
            about("drive-power", "XU3"),
        ],
        CHAIN,
    )
    assert rules(found) == (["feedback-open", "drive-power"], ["headroom-output"])


def test_in_a_ring_the_gravest_leads():
    """In a state-variable loop each stage comes after each: one of them is the cause."""
    ring = design(stage("XU1", after=("XU2",)), stage("XU2", after=("XU1",)))
    found = merge(
        [
            about("headroom-output", "XU1", severity="major"),
            about("headroom-output", "XU2", severity="critical"),
        ],
        ring,
    )
    assert tree(found) == [("headroom-output", ("XU2",), [("headroom-output", ("XU1",), "XU2")])]
    equal = merge([about("headroom-output", n, severity="major") for n in ("XU2", "XU1")], ring)
    assert [f.designators for f in equal] == [("XU1",)]


def test_no_finding_is_ever_lost():
    """However causes point at each other, every finding is told once."""
    ring = design(*(stage(f"XU{i}", after=(f"XU{i % 3 + 1}",)) for i in (1, 2, 3)))
    many = [
        about(rule, f"XU{i}", severity="critical", nets=("n",), demand=2.0, limit=1.0, margin=-1.0)
        for i in (1, 2, 3)
        for rule in (
            "supply-missing", "feedback-open", "bias-no-dc-path", "headroom-output",
            "headroom-input", "drive-current", "feedback-low", "supply-range", "drive-tied",
        )
    ]  # fmt: skip
    found = merge(many, ring)
    told = [f for top in found for f in (top, *top.consequences)]
    assert len(told) == len(many)
    assert {(f.rule, f.designators) for f in told} == {(f.rule, f.designators) for f in many}
    assert all(not c.consequences for top in found for c in top.consequences)


def test_a_misread_value_takes_along_what_was_worked_out_with_it():
    """Everything of the stage that R2 belongs to hangs under R2's own finding."""
    trap = about("netlist-value-suffix", "R2", severity="minor")
    found = merge([about("headroom-output", "XU1"), about("feedback-high", "XU1"), trap], ONE)
    assert rules(found) == (["netlist-value-suffix"], ["feedback-high", "headroom-output"])
    assert {c.cause for c in found[0].consequences} == {"R2"}


def test_two_readings_of_about_one_value_explain_nothing():
    """6k8 is 6 kilohm or 6.8 kilohm: whatever is wrong with the stage, it is not that."""
    clip = about("headroom-output", "XU1")
    near = about("netlist-value-suffix", "R2", severity="minor", demand=6800.0, limit=6000.0)
    assert rules(merge([clip, near], ONE)) == (["headroom-output", "netlist-value-suffix"], [])
    far = changed(near, demand=1e6, limit=1e-3)
    assert rules(merge([clip, far], ONE)) == (["netlist-value-suffix"], ["headroom-output"])


def test_a_misread_feedback_resistor_turns_no_supply_round():
    """What feeds the pins is the rails' own."""
    trap = about("netlist-value-suffix", "R2", severity="minor")
    found = merge([about("supply-reversed", "XU1", nets=("+12V",)), trap], ONE)
    assert rules(found) == (["supply-reversed", "netlist-value-suffix"], [])


def test_a_remark_on_a_pole_is_no_cause_of_a_bias_error():
    """Large resistors are it where they are as bad as what follows."""
    error = about("bias-current-error", "XU1")
    remark = about("feedback-high", "XU1", severity="remark")
    assert rules(merge([error, remark], ONE)) == (["bias-current-error", "feedback-high"], [])
    as_bad = changed(remark, severity="major")
    assert rules(merge([error, as_bad], ONE)) == (["feedback-high"], ["bias-current-error"])


@pytest.mark.parametrize(
    ("culprit", "top"), [("offset of XU1", "headroom-offset"), ("R2", "headroom-output")]
)
def test_a_range_that_offset_alone_makes_too_wide_follows_from_the_offset(culprit, top):
    """At nominal, or where a resistor moves it most, the clipped range leads."""
    output = Output(net="out", high=high(culprits=(culprit, "VP")), low=low())
    whole = design(stage(output=output))
    clip = changed(about("headroom-output", "XU1", demand=12.0, limit=9.5), corner="worst-case")
    found = merge([clip, about("headroom-offset", "XU1")], whole)
    assert [f.rule for f in found] == [top]
    nominal = merge([changed(clip, corner="nominal"), about("headroom-offset", "XU1")], whole)
    assert [f.rule for f in nominal] == ["headroom-output"]


def test_a_misread_value_elsewhere_explains_nothing():
    """An element far from the stage has nothing to do with it."""
    far = design(stage(), elements=(resistor("R99", 1.0, "x", "y"),))
    found = merge([about("netlist-value-suffix", "R99"), about("headroom-output", "XU1")], far)
    assert rules(found)[1] == []


def test_a_misread_rail_or_capacitor_takes_its_rail_along():
    """A rail's source and its capacitors belong to the rail's findings."""
    whole = design(stage(), rails=(rail(origin="VP", decoupling=(capacitor("C9", 1e-15),)),))
    for designator, rule in (("VP", "supply-name-disagrees"), ("C9", "decoupling-absent")):
        found = merge(
            [about("netlist-value-suffix", designator), about(rule, "U1", nets=("+12V",))], whole
        )
        assert rules(found) == (["netlist-value-suffix"], [rule])


def test_a_cause_is_never_milder_than_what_follows():
    """A minor misreading with a critical consequence is critical: it must not hide it."""
    found = merge(
        [
            about("netlist-value-suffix", "R2", severity="minor"),
            about("headroom-output", "XU1", severity="critical"),
        ],
        ONE,
    )
    assert [f.severity for f in found] == ["critical"]


def test_a_load_is_no_reason_for_a_range():
    """A misread resistor at the output explains what the output must drive, and nothing else."""
    loaded = design(stage(), elements=(resistor("RL", 1e4, "out", "0"),))
    trap = about("netlist-value-suffix", "RL", severity="minor")
    assert rules(merge([about("headroom-output", "XU1"), trap], loaded))[1] == []
    assert rules(merge([about("drive-current", "XU1"), trap], loaded))[1] == ["drive-current"]


def test_a_high_network_explains_a_range_only_at_the_corner():
    """Bias current moves the corner, not the nominal range."""
    high, clip = about("feedback-high", "XU1"), about("headroom-output", "XU1")
    assert rules(merge([high, clip], ONE))[1] == []
    corner = changed(clip, corner="worst-case")
    assert rules(merge([high, corner], ONE))[1] == ["headroom-output"]


def test_a_low_supply_explains_headroom_and_a_high_one_does_not():
    """Too few volts cost range; too many do not."""
    pair = [about("headroom-output", "XU1")]
    low = merge([*pair, about("supply-range", "XU1", demand=5.0, limit=7.0)], ONE)
    high = merge([*pair, about("supply-range", "XU1", demand=45.0, limit=42.0)], ONE)
    assert rules(low)[1] == ["headroom-output"]
    assert rules(high)[1] == []


def test_a_corner_of_the_supply_explains_nothing_at_nominal():
    """A supply that is too low only at a corner is no cause of clipping at nominal."""
    corner = changed(about("supply-range", "XU1", demand=6.9, limit=7.0), corner="worst-case")
    assert rules(merge([corner, about("headroom-output", "XU1")], ONE))[1] == []


def test_a_current_asked_only_because_the_range_is_too_wide():
    """Clipped to what it reaches, the output asks for less than its limit: a consequence."""
    clip = about("headroom-output", "XU1", demand=20.0, limit=10.0)
    fits = about("drive-current", "XU1", demand=8e-3, limit=5e-3)
    heavy = about("drive-current", "XU1", demand=12e-3, limit=5e-3)
    assert rules(merge([clip, fits], ONE))[1] == ["drive-current"]
    assert rules(merge([clip, heavy], ONE))[1] == []


def test_a_load_that_takes_the_range_is_the_cause():
    """Where the unloaded output would reach, clipping follows from the load and not the reverse."""
    swing = (SwingPoint(amps=1e-3, typical=1.5), SwingPoint(amps=5e-3, typical=3.0))
    whole = design(stage(family=changed(FAMILY, swing_high=swing)))
    load = about("drive-current", "XU1", demand=50e-3, limit=40e-3)
    clip = about("headroom-output", "XU1", demand=10.0, limit=3.0)
    assert rules(merge([clip, load], whole)) == (["drive-current"], ["headroom-output"])
    beyond = about("headroom-output", "XU1", demand=11.0, limit=3.0)
    assert rules(merge([beyond, load], whole)) == (["headroom-output"], ["drive-current"])


def test_a_network_that_alone_is_too_heavy_is_the_cause():
    """Where feedback alone takes too much, the output's current follows from it."""
    alone = about("feedback-low", "XU1", margin=-1e-3)
    share = about("feedback-low", "XU1", margin=1e-3)
    load = about("drive-current", "XU1")
    assert rules(merge([alone, load], ONE))[1] == ["drive-current"]
    assert rules(merge([share, load], ONE))[1] == []


def test_an_input_follows_its_output():
    """One signal at both ends of a stage is one fault where the side is the same.

    The common level of a difference amplifier is another thing than what its output is asked for.
    """
    whole = design(stage(topology="follower"))
    out = about("headroom-output", "XU1", demand=12.0, limit=10.0)
    same = about("headroom-input", "XU1", demand=12.0, limit=9.0)
    other = about("headroom-input", "XU1", demand=-12.0, limit=-9.0)
    assert rules(merge([out, same], whole))[1] == ["headroom-input"]
    assert rules(merge([out, other], whole))[1] == []
    assert rules(merge([out, same], ONE))[1] == ["headroom-input"]
    assert rules(merge([out, same], design(stage(topology="difference"))))[1] == []


def test_upstream_goes_through_other_stages_and_never_names_itself():
    """All stages before, through a ring as well."""
    assert upstream(CHAIN.stages[2], CHAIN) == {"XU1", "XU2"}
    ring = design(stage("XU1", after=("XU2",)), stage("XU2", after=("XU1",)))
    assert upstream(ring.stages[0], ring) == {"XU2"}


def test_elements_of_a_stage():
    """The feedback, the way of the inputs, what moves a corner, and what stands at its pins."""
    one = stage(
        feedback=Feedback(elements=("R2",)),
        output=Output(net="out", high=changed(stage().output.high, culprits=("R40",))),
    )
    assert {"R1", "R2", "R40"} <= elements_of(one, design(one))
    assert "VP" not in elements_of(one, design(one))


def test_worst_first_then_by_place():
    """Severity, then file and line; what has no place comes last."""
    here = changed(about("bias-level", severity="minor"), location=stage().location)
    lost = about("bias-level", severity="minor")
    grave = about("supply-missing", severity="critical")
    assert sorted([lost, here, grave], key=order) == [grave, here, lost]


def test_one_rail_that_is_wrong_for_several_devices_is_one_finding():
    """A rail too high for two kinds of package; too high for one and too low for another is two."""
    high = [
        about("supply-range", f"XU{n}", nets=("+12V", "-12V"), demand=44.0, limit=36.0, margin=-8.0)
        for n in (1, 2)
    ]
    assert rules(merge(high, CHAIN)) == (["supply-range"], ["supply-range"])
    low = changed(high[1], demand=44.0, limit=50.0)
    assert len(merge([high[0], low], CHAIN)) == 2


def test_an_output_tied_to_a_rail_explains_the_rail():
    """The rail's level is what the output makes of it."""
    tied = about("drive-tied", "XU1", nets=("+12V",))
    rail_too = about("supply-range", "XU4", nets=("+12V", "-12V"), demand=44.0, limit=36.0)
    assert rules(merge([rail_too, tied], CHAIN)) == (["drive-tied"], ["supply-range"])
    elsewhere = about("supply-range", "XU4", nets=("+5V", "0"), demand=44.0, limit=36.0)
    assert rules(merge([elsewhere, tied], CHAIN))[1] == []


def test_a_load_between_two_outputs_is_one_finding():
    """Both ends of one resistor ask for the same current."""
    into = changed(stage().current, into="RL")
    pair = design(stage("XU1", current=into), stage("XU2", current=into))
    both = [about("drive-current", "XU2"), about("drive-current", "XU1")]
    assert tree(merge(both, pair)) == [
        ("drive-current", ("XU1",), [("drive-current", ("XU2",), "RL")])
    ]
    apart = design(stage("XU1", current=into), stage("XU2", current=changed(into, into="RM")))
    assert len(merge(both, apart)) == 2


def test_a_comparator_is_no_cause():
    """A stage that is meant to switch explains nothing; its thresholds follow its rails."""
    switching = design(stage(use="comparator"))
    meant = about("feedback-reversed", "XU1", severity="remark")
    above = about("drive-input-above-rail", "XU1")
    assert len(merge([meant, above], switching)) == 2
    never = about("feedback-reversed", "XU1", severity="critical")
    supply = about("supply-range", "XU1", demand=44.0, limit=36.0)
    assert rules(merge([never, supply], switching)) == (["supply-range"], ["feedback-reversed"])
    assert len(merge([never, supply], ONE)) == 2


def test_a_missing_value_explains_the_feedback_it_was_to_be():
    """An element at the output, or before the stages in front, whose value nobody knows."""
    missing = about("netlist-value-missing", "R9")
    elements = (resistor("R9", 1e4, "out", "b"), resistor("R8", 1e4, "b", "n"))
    whole = design(stage(), elements=elements)
    assert rules(merge([about("feedback-open", "XU1"), missing], whole))[1] == ["feedback-open"]
    pins = changed(stage().inputs, plus=pin("p2"), minus=pin("n2"))
    second = stage("XU2", after=("XU1",), inputs=pins)
    chain = design(stage(feedback=Feedback(elements=("R9",))), second, elements=elements)
    later = about("headroom-output", "XU2")
    assert rules(merge([later, missing], chain))[1] == ["headroom-output"]


def test_one_reference_that_takes_several_stages_out_is_one_finding():
    """Two stages on one source's net that rest beyond their ranges, at either end."""
    pins = changed(stage().inputs, plus=pin("ref", level=11.9))
    high = changed(stage().output, level=11.9)
    first = stage("XU1", inputs=pins, output=high)
    second = stage("XU2", inputs=pins, output=high)
    elements = (voltage_source("VREF", 11.9, "ref", "0"),)
    found = [
        about("headroom-output", name, severity=severity, demand=11.9, limit=10.5)
        for name, severity in (("XU1", "major"), ("XU2", "critical"))
    ]
    whole = design(first, second, elements=elements)
    assert tree(merge(found, whole)) == [
        ("headroom-output", ("XU2",), [("headroom-output", ("XU1",), "ref")])
    ]
    assert len(merge(found, design(first, second, elements=()))) == 2
    resting = changed(first, output=changed(high, level=5.0))
    assert len(merge(found, design(resting, second, elements=elements))) == 2


def test_a_stage_without_a_loop_explains_the_network_that_ends_at_it():
    """The other half of an instrument amplifier hangs on a net that nothing holds."""
    elements = (resistor("RG", 1e3, "n1", "n2"), resistor("R2", 1e4, "n2", "o2"))
    pins = changed(stage().inputs, minus=pin("n2"))
    half = stage("XU2", inputs=pins)
    open_loop = about("feedback-open", "XU1", severity="critical", nets=("o1", "n1"))
    high = about("feedback-high", "XU2")
    assert rules(merge([high, open_loop], design(stage(), half, elements=elements)))[1] == [
        "feedback-high"
    ]
    assert len(merge([high, open_loop], design(stage(), half, elements=elements[1:]))) == 2


def test_in_a_ring_of_causes_the_first_one_told_is_the_cause(monkeypatch):
    """Everything in the ring, and what follows from it, hangs under the smallest index."""
    names = ("behind", "first", "second", "third")
    follows = {"behind": "third", "first": "second", "second": "third", "third": "first"}
    links = tuple(
        Link(causes=(cause,), follows=(rule,), related=lambda *_: "ring")
        for rule, cause in follows.items()
    )
    monkeypatch.setattr("railguard.rules.causes.LINKS", links)
    (root,) = merge([about(name) for name in names], ONE)
    assert root.rule == "first"
    assert {consequence.rule for consequence in root.consequences} == {"behind", "second", "third"}


def test_equals_stand_in_the_order_of_the_netlist():
    """By file and line, then by rule; what has no place comes last."""
    places = ((None, "a"), (("b.cir", 3), "a"), (("a.cir", 20), "a"), (("a.cir", 3), "b"))
    found = [
        changed(about("drive-power", name), location=place and Location(*place))
        for place, name in places
    ]
    said = [f.location and (f.location.file, f.location.line) for f in sorted(found, key=order)]
    assert said == [("a.cir", 3), ("a.cir", 20), ("b.cir", 3), None]
