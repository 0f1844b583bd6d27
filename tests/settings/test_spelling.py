"""Statements in the spelling of one netlist."""

import pytest

from railguard.circuit.model import Directive
from railguard.devices.names import schematic_name
from railguard.location import Location
from railguard.settings.directives import apply
from railguard.settings.file import parse
from railguard.settings.model import Settings
from railguard.settings.spelling import respelt

NETS = ("0", "vbat", "/LEVEL", "S+", "S-", "OUT")
DESIGNATORS = ("XU1", "XCH1.XU2", "R1", "U3")


def spelt(text):
    """Return settings from a file, respelt for the netlist above."""
    made, problems = respelt(parse(text, "railguard.toml"), NETS, DESIGNATORS, schematic_name)
    assert problems == ()
    return made


@pytest.mark.parametrize(
    ("stated", "found"),
    [("VBAT", "vbat"), ("LEVEL", "/LEVEL"), ("level", "/LEVEL"), ("GND", "0"), ("OTHER", "OTHER")],
)
def test_a_net_is_found_in_the_netlist_s_spelling(stated, found):
    """Without regard to case, with a label's slash, ground by its names; others stay."""
    assert list(spelt(f"[nets]\n{stated} = {{ volts = 1 }}").nets) == [found]
    assert spelt(f"[signals]\n{stated} = {{ peak = 1 }}").signals[0].name == found
    assert spelt(f"[loads]\n{stated} = {{ ohms = 1 }}").loads[0].net == found
    assert spelt(f"[loads]\nOUT = {{ ohms = 1, to = '{stated}' }}").loads[0].to == found


def test_the_free_name_of_a_differential_signal_stays():
    """Only its nets are names of the netlist."""
    made = spelt("[signals]\nout = { between = ['s+', 's-'], peak = 1 }").signals[0]
    assert (made.name, made.between) == ("out", ("S+", "S-"))


@pytest.mark.parametrize(
    ("stated", "found"),
    [("XU1", "XU1"), ("U1", "XU1"), ("u1", "XU1"), ("CH1.U2", "XCH1.XU2"), ("U3", "U3")],
)
def test_a_stage_is_found_in_either_spelling(stated, found):
    """As on the schematic or as in the netlist."""
    made = spelt(f"[stages]\n'{stated}' = {{ use = 'comparator', pins = ['a', 'b', 'c'] }}")
    assert dict(made.uses) == {found: "comparator"}
    assert dict(made.pins) == {found: ("a", "b", "c")}


def test_a_directive_on_a_net_that_is_not_there_is_a_problem():
    """It speaks of its own netlist only, so the name is wrong."""
    directives = [
        Directive("rail VBATT 12", Location("station.cir", 1)),
        Directive("load OUT 600 to=GND", Location("station.cir", 2)),
    ]
    made, _ = apply(Settings(), directives)
    _, (problem,) = respelt(made, NETS, DESIGNATORS, schematic_name)
    assert problem.message == (
        'A directive speaks of the net "VBATT", which this netlist does not have.'
    )
    assert problem.remedy == 'The nearest is "vbat".'
    assert problem.location == Location("station.cir", 1)
