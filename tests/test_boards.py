"""Board exports in ten spellings: the right op-amps, the right pins, the right rails.

Every deck of `fixtures/board` says in its header what is on the board: for each amplifier
`* pins: U1A FAMILY in+ in- v+ v- out`, for each net that supplies one `* rail: NET VOLTS`.
"""

from pathlib import Path

import pytest

from railguard.analysis.recognise import keeps_closed, recognise
from railguard.circuit.flatten import flatten
from railguard.deck.files import read_deck
from railguard.devices import catalogue
from railguard.reviewing import review
from railguard.settings.model import Settings

BOARDS = Path(__file__).resolve().parent.parent / "fixtures" / "board"
DECKS = sorted(path for path in BOARDS.rglob("*.cir") if "* pins:" in path.read_text("utf-8"))


def stated(path, word):
    """Return the words of a deck's header lines of one kind."""
    lines = path.read_text("utf-8").splitlines()
    return [line.split()[2:] for line in lines if line.startswith(f"* {word}:")]


def test_there_are_ten_spellings_of_four_boards():
    """What the tests below are worth."""
    assert len({path.parent for path in DECKS}) == 10
    assert len(DECKS) == 40


@pytest.mark.parametrize("path", DECKS, ids=lambda p: f"{p.parent.name}-{p.stem}")
def test_op_amps_and_pins(path):
    """Every amplifier with its family and its five nets, and nothing else taken for one."""
    devices = catalogue.load(())
    circuit = flatten(read_deck(path), keeps_closed(devices))
    found = recognise(circuit, devices, Settings())
    amplifiers = [
        [a.schematic, a.match.device.family, a.plus, a.minus, a.positive, a.negative, a.output]
        for a in found.amplifiers
    ]
    assert sorted(amplifiers) == sorted(stated(path, "pins"))
    assert not [p for p in circuit.problems if p.rule in ("netlist-card", "netlist-node-count")]


@pytest.mark.parametrize("path", DECKS, ids=lambda p: f"{p.parent.name}-{p.stem}")
def test_rails(path):
    """Every rail with its level."""
    (design,) = review(path).designs
    levels = {rail.net: rail.level for rail in design.design.rails if rail.net != "0"}
    wanted = {net: pytest.approx(float(volts), rel=1e-3) for net, volts in stated(path, "rail")}
    assert levels == wanted
    assert design.design.kind == "board"
