"""The current an output must give."""

import pytest

from railguard.analysis.bound import Pair
from railguard.analysis.loop import Loop
from railguard.analysis.stage import Carrier, Current, Unknown
from railguard.devices.model import UNLISTED_CURRENT
from railguard.rules.drive.current import CURRENT
from tests.rules.stages import amps, findings, open_points, outcomes, stage, unknown_device


def giving(source=1e-3, sink=1e-3, **fields):
    """Make a stage with other output currents."""
    current = Current(
        source=amps(source), sink=amps(sink), load=1000.0, into="RL", short_circuit=40e-3
    )
    return stage(**{"current": current, **fields})


def test_a_light_load_is_quiet():
    """Up to what the device is known to give nothing is told."""
    assert outcomes(CURRENT, stage()) == []
    assert findings(CURRENT, giving(5e-3)) == []


def test_beyond_what_is_known_to_be_given():
    """Between the known and the typical current it is major."""
    (found,) = findings(CURRENT, giving(6e-3))
    assert found.severity == "major"
    assert found.message == (
        "U1 must source 6 mA into RL; a TL072 is known to give 5 mA (guaranteed, data sheet), "
        "so 1 mA is not covered."
    )
    assert "from 1 kΩ to at least 1.2 kΩ" in found.remedy
    assert (found.demand, found.limit, found.unit) == (6e-3, 5e-3, "A")


@pytest.mark.parametrize(("worse", "other"), [("sink", "source"), ("source", "sink")])
def test_both_directions_make_one_finding(worse, other):
    """The worse one leads."""
    (found,) = findings(CURRENT, giving(**{worse: 20e-3, other: 6e-3}))
    assert found.severity == "critical"
    assert found.nets == ("out",)
    assert found.message == (
        f"U1 must {worse} 20 mA into RL; a TL072 gives 10 mA (typical, data sheet), so 10 mA is "
        f"missing. It must {other} 6 mA as well, against 5 mA."
    )


@pytest.mark.parametrize(
    ("demand", "basis", "note"),
    [
        (50e-3, "catalogue", "gives 10 mA (typical short-circuit current, data sheet)"),
        (6e-3, "practice", "known to give 5 mA (half its short-circuit current, common practice)"),
        (6e-3, "catalogue", "known to give 5 mA (swing is guaranteed at 2 kΩ, data sheet)"),
    ],
)
def test_where_no_output_current_is_listed(demand, basis, note):
    """The sentence says what stands in for it."""
    listed = {"condition": f"{UNLISTED_CURRENT}: swing is guaranteed at 2 kΩ"}
    source = amps(demand, guaranteed_basis=basis, **listed)
    (found,) = findings(CURRENT, stage(current=Current(source=source, sink=amps())))
    assert note in found.message


def test_a_corner_of_tolerances_is_told_as_such():
    """A current that only a corner asks for is worst-case."""
    current = Current(source=amps(4.9e-3, default=Pair(5.1e-3, 5e-3)), sink=amps())
    (found,) = findings(CURRENT, stage(current=current))
    assert (found.severity, found.corner) == ("minor", "worst-case")


def test_a_reserve_can_be_asked_for():
    """By default the known current may be used up; a share to be left is the user's to set."""
    assert findings(CURRENT, giving(4.8e-3)) == []
    assert findings(CURRENT, giving(4.4e-3), reserve_share=0.1) == []
    (found,) = findings(CURRENT, giving(4.8e-3), reserve_share=0.1)
    assert found.severity == "minor"
    assert found.message == (
        "U1 must source 4.8 mA into RL; a TL072 is known to give 5 mA (guaranteed, data sheet): "
        "200 µA is left."
    )


def test_an_unknown_device_is_minor_and_not_checked():
    """A few milliamperes by common practice, minor at most."""
    practice = {"typical_basis": "practice", "guaranteed_basis": "practice"}
    one = unknown_device(current=Current(source=amps(0.1, **practice), sink=amps(**practice)))
    assert [f.severity for f in findings(CURRENT, one)] == ["minor"]
    assert len(open_points(CURRENT, one)) == 1


def test_a_device_nobody_knows_is_minor_however_it_is_limited():
    """Limits that an engine measured are no data sheet's."""
    one = unknown_device(current=Current(source=amps(0.1, typical=None), sink=amps()))
    assert [f.severity for f in findings(CURRENT, one)] == ["minor"]


@pytest.mark.parametrize(("demand", "severity"), [(14e-3, "major"), (16e-3, "critical")])
def test_far_beyond_a_guaranteed_current_where_no_typical_one_is_listed(demand, severity):
    """Three times what it is known to give is as bad as beyond a typical limit."""
    one = stage(current=Current(source=amps(demand, typical=None), sink=amps()))
    (found,) = findings(CURRENT, one)
    assert found.severity == severity
    assert open_points(CURRENT, one) == []


@pytest.mark.parametrize(
    ("load", "demand", "guaranteed", "into"),
    [
        (1000.0, 6.1e-3, 5e-3, "raise what the output works into from 1 kΩ to at least 1.3 kΩ"),
        (None, 6.1e-3, 5e-3, ""),
        (0.0, 6.1e-3, 5e-3, ""),
        (1000.0, 6.1e-3, 0.0, ""),
    ],
)
def test_what_to_do_about_too_much_current(load, demand, guaranteed, into):
    """A load that fits, where one is known that could; a buffer or another device in any case."""
    source = amps(demand, guaranteed=guaranteed)
    (found,) = findings(CURRENT, stage(current=Current(source=source, sink=amps(), load=load)))
    choices = [f"{into}, its feedback network included"] if into else []
    choices += ["put a buffer behind the stage", "fit a device that gives more current"]
    text = ", or ".join(choices)
    assert found.remedy == f"{text[0].upper()}{text[1:]}."


def carrying(verb="source", demand=6e-3, takes=5e-3, guaranteed=5e-3, others=()):
    """Make a stage that drives a transistor of a gain of 50, whose base takes most of it."""
    carrier = Carrier(designators=("Q1",), carries=0.31, takes=takes, gain=50)
    side = amps(demand, guaranteed=guaranteed, condition="2 kΩ load")
    current = Current(
        **{"source": amps(), "sink": amps(), verb: side},
        demand_source=demand if verb == "source" else 0.0,
        demand_sink=demand if verb == "sink" else 0.0,
        load=1000.0,
        into="RL",
        carriers=(*others, carrier),
    )
    return stage(current=current)


@pytest.mark.parametrize("verb", ["source", "sink"])
def test_a_base_that_takes_too_much_wants_a_transistor_of_more_gain(verb):
    """5 of 6 mA are its base's: 310 mA over the 4 mA that are left for it, the next value up."""
    small = Carrier(designators=("Q2",), carries=0.5, takes=1e-3, gain=500)
    (found,) = findings(CURRENT, carrying(verb, others=(small,)))
    assert found.message == (
        f"U1 must {verb} 6 mA into the base of Q1, which carries 310 mA at a current gain of 50 "
        "(as its model states); a TL072 is known to give 5 mA (guaranteed, 2 kΩ load, data sheet), "
        "so 1 mA is not covered."
    )
    assert found.remedy == (
        "Fit one for Q1 with a gain of at least 82 at 310 mA, or put a second transistor in front "
        "of Q1, a Darlington, or fit a device that gives more current."
    )


def test_a_gain_that_no_transistor_has_is_not_asked_for():
    """What is not the base's, 1 mA, is all the device gives."""
    (found,) = findings(CURRENT, carrying(guaranteed=1e-3))
    assert found.remedy == (
        "Put a second transistor in front of Q1, a Darlington, or fit a device that gives more "
        "current."
    )


def test_a_base_that_takes_less_than_half_is_not_what_it_goes_into():
    """2.9 of 6 mA: the load is named, and to be raised."""
    (found,) = findings(CURRENT, carrying(takes=2.9e-3))
    assert "into RL" in found.message
    assert found.remedy.startswith("Raise what the output works into from 1 kΩ")


def test_a_load_of_half_an_ohm_is_a_load():
    """6 mA where 5 are known to be given: 0.6 ohm, the next value up."""
    current = Current(source=amps(6e-3), sink=amps(), load=0.5)
    (found,) = findings(CURRENT, stage(current=current))
    assert "from 500 mΩ to at least 620 mΩ" in found.remedy


def test_an_output_into_nothing_named():
    """The sentence does without."""
    (found,) = findings(CURRENT, stage(current=Current(source=amps(6e-3), sink=amps())))
    assert found.message.startswith("U1 must source 6 mA; a TL072")


def test_an_unknown_current_is_not_checked():
    """A stage whose load or signal is not known is listed."""
    one = stage(current=Current(source=amps(None), sink=amps(None)))
    (point,) = open_points(CURRENT, one)
    assert "[loads]" in point.add
    told = stage(unknown={"current": Unknown("a diode conducts", "run ngspice")})
    assert [p.why for p in open_points(CURRENT, told)] == ["a diode conducts"]


def test_unlisted_currents_are_named():
    """A device without current figures says which to add."""
    bare = amps(1e-3, typical=None, guaranteed=None)
    (point,) = open_points(CURRENT, stage(current=Current(source=bare, sink=bare)))
    assert point.why == "the output current of TL072 is not in the catalogue"
    assert "source_current" in point.add


def test_a_comparator_is_judged_by_its_current_and_an_unused_channel_is_not():
    """A comparator drives its load at its limits; an unused channel drives nothing."""
    assert len(findings(CURRENT, giving(20e-3, use="comparator"))) == 1
    assert outcomes(CURRENT, giving(20e-3, use="unused")) == []


@pytest.mark.parametrize("dc", ["positive", "open"])
def test_a_broken_loop_has_no_demand(dc):
    """Where no feedback holds the output its current means nothing."""
    one = giving(20e-3, loop=Loop(dc=dc))
    assert findings(CURRENT, one) == []
    assert len(open_points(CURRENT, one)) == 1
