"""Decks drawn by hand from handbook practice are quiet, whatever circuit they hold.

They were written before anybody looked at what the rules do with them. Where one is not quiet, the
tool is wrong until the deck is shown to be.
"""

from pathlib import Path

import pytest

from railguard.reviewing import review
from railguard.rules.circuits import CIRCUITS
from railguard.words import at_or_above

SOUND = Path(__file__).resolve().parent.parent / "fixtures" / "sound"
DECKS = sorted(SOUND.glob("*.cir"))
LEAST_DECKS = 20

NAMED = {
    "comparator": "flood_lamp",
    "relaxation oscillator": "heater_oscillator",
    "sine oscillator, stated": "conductivity_wien",
    "sine oscillator, not stated": "wien_unstated",
    "function generator": "triangle_generator",
    "half-wave rectifier": "half_wave",
    "full-wave rectifier": "absolute_value",
    "peak detector": "peak_hold",
    "current pump": "howland_rtd",
    "improved current pump": "howland_improved",
    "state-variable filter": "wave_filter",
    "composite amplifier": "composite_gauge",
    "servo loop": "hydrophone_servo",
    "bridge-tied pair": "siren_bridge",
    "boosted output": "sluice_driver",
    "current sink": "beacon_lamp",
    "4-20 mA transmitter, two wires": "loop_transmitter",
    "4-20 mA transmitter, three wires": "three_wire_transmitter",
}
ALIASES = {
    "function generator": "relaxation oscillator",
    "half-wave rectifier": "precision rectifier",
    "full-wave rectifier": "precision rectifier",
    "improved current pump": "current pump",
}
USES = {
    ("flood_lamp", "XU1A"): "comparator",
    ("flood_lamp", "XU1B"): "linear",
    ("heater_oscillator", "XU1"): "oscillator",
    ("wien_unstated", "XU1"): "oscillator",
    ("triangle_generator", "XU1A"): "oscillator",
    ("triangle_generator", "XU1B"): "oscillator",
    ("half_wave", "XU1"): "linear",
    ("absolute_value", "XU1A"): "linear",
    ("peak_hold", "XU1A"): "linear",
    ("howland_rtd", "XU1"): "linear",
    ("rain_integrator", "XU1"): "linear",
    ("window_alarm", "XU1A"): "comparator",
}


def flat(findings):
    """Yield findings and their consequences."""
    for finding in findings:
        yield finding
        yield from flat(finding.consequences)


def test_the_decks_hold_every_circuit_that_is_often_misjudged():
    """At least twenty decks, and each circuit of the list among them."""
    names = {path.stem for path in DECKS}
    assert len(names) >= LEAST_DECKS
    assert set(NAMED.values()) <= names


def test_what_is_assumed_of_each_is_written_down():
    """`railguard rules circuits` has every circuit that is often misjudged."""
    told = [circuit.name for circuit in CIRCUITS]
    for name in NAMED:
        word = ALIASES.get(name.split(",")[0], name.split(",")[0])
        assert any(word in one for one in told), name


@pytest.mark.parametrize("path", DECKS, ids=lambda path: path.stem)
def test_a_sound_deck_is_quiet_and_judged(path):
    """No critical, no major, and more judged than left open."""
    (design,) = review(path, plugins=False).designs
    loud = [f for f in flat(design.findings) if at_or_above(f.severity, "major")]
    assert not loud, [f"{f.rule} {f.designators}: {f.message}" for f in loud]
    assert design.judged > 5 * design.open


@pytest.mark.parametrize(("deck", "who"), USES, ids=lambda value: value)
def test_the_use_of_a_stage_is_worked_out(deck, who):
    """What a stage is for is seen where it matters."""
    (design,) = review(SOUND / f"{deck}.cir", plugins=False).designs
    (stage,) = [s for s in design.design.stages if s.designator == who]
    assert stage.use == USES[deck, who]
