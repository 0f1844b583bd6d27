"""The package as people use it from Python: `import railguard`."""

import subprocess
import sys
from pathlib import Path

import pytest

import railguard
from railguard.notices import NotChecked
from tests import gauge

ROOT = Path(__file__).parents[1]
STATION = ROOT / "fixtures" / "station" / "station.cir"
CLIPPED = ROOT / "fixtures" / "faults" / "headroom-output.cir"
BOARD = ROOT / "fixtures" / "board" / "gauge_board.cir"
HEAVY = ("msgspec", "numpy", "click")


def python(code):
    """Run code in an interpreter of its own; return what it printed."""
    return subprocess.run(
        [sys.executable, "-W", "error", "-c", code],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=True,
    ).stdout


def test_importing_the_package_costs_nothing():
    """No dependency is loaded before something is asked for."""
    code = f"import sys, railguard; print([m for m in {HEAVY} if m in sys.modules])"
    assert python(code) == "[]\n"


def test_review_stays_a_function():
    """Nothing of the package is imported over it."""
    code = (
        "import railguard, railguard.reviewing, railguard.commands.review\n"
        f"print(railguard.review({str(STATION)!r}).designs[0].verdict)"
    )
    assert python(code) == "pass\n"


@pytest.mark.parametrize("name", railguard.__all__)
def test_every_public_name_is_there(name):
    """Each of them can be had, and is listed."""
    assert getattr(railguard, name) is not None
    assert name in dir(railguard)


def test_a_name_that_is_not_there_is_an_attribute_error():
    """As for any module."""
    with pytest.raises(AttributeError, match="reveiw"):
        railguard.reveiw  # noqa: B018 - asking for it is the test


def test_the_package_says_that_it_is_typed():
    """Type checkers look for this file."""
    assert (ROOT / "railguard" / "py.typed").is_file()


def test_a_type_checker_knows_what_review_returns(tmp_path):
    """The types reach those who use the package: a right use passes, a wrong one does not."""
    user = tmp_path / "user.py"
    user.write_text(
        "import railguard\n"
        "found: railguard.Review = railguard.review('a.cir', settings='railguard.toml')\n"
        "text: str = found.designs[0].findings[0].message\n"
        "wrong: int = railguard.assert_sound('a.cir')\n"
    )
    done = subprocess.run(
        [sys.executable, "-m", "mypy", "--strict", str(user)],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    complaints = [line for line in done.stdout.splitlines() if "error:" in line]
    assert len(complaints) == 1, done.stdout
    assert "user.py:4" in complaints[0]


def test_a_sound_circuit_gives_its_review():
    """The review comes back, for assertions on its numbers."""
    found = railguard.assert_sound(gauge.SOUND)
    (stage,) = found.designs[0].design.stages
    assert stage.output.demand.high == pytest.approx(1.0, rel=0.01)


def test_a_clipped_circuit_is_an_assertion_error_one_can_read():
    """Stage, rule, numbers and remedy are in it; what does not hold is not."""
    with pytest.raises(AssertionError) as caught:
        railguard.assert_sound(CLIPPED)
    told = str(caught.value)
    assert "U5A" in told
    assert "headroom-output" in told
    assert "8.1 V" in told
    assert "Remedy" in told
    assert "How it was read" not in told


def test_the_hold_level_may_be_moved():
    """What passes at major fails at minor."""
    railguard.assert_sound(BOARD)
    with pytest.raises(AssertionError, match="minor"):
        railguard.assert_sound(BOARD, hold_at="minor")


def test_a_required_family_must_not_stay_open():
    """What could not be judged is said, with what to state."""
    with pytest.raises(AssertionError, match="Not checked") as caught:
        railguard.assert_sound(BOARD, require=["headroom"])
    assert "To check" in str(caught.value)


@pytest.mark.parametrize("text", ["no op-amp\nR1 a 0 1k\nV1 a 0 5\n.end\n"])
def test_a_circuit_without_op_amps_is_not_sound(text):
    """Where nothing was judged, nothing is asserted."""
    with pytest.raises(AssertionError, match="no op-amp"):
        railguard.assert_sound(text)


def test_no_netlist_at_all_is_not_sound():
    """A glob that finds nothing must not pass a test."""
    with pytest.raises(AssertionError, match="no netlist"):
        railguard.assert_sound([])


def test_waived_findings_hold_nothing(tmp_path):
    """An agreed acceptance counts here as well."""
    deck = tmp_path / "gauge.cir"
    deck.write_text(CLIPPED.read_text())
    toml = '[[waivers]]\nrule = "headroom-output"\ndesignator = "U5A"\nreason = "bench only"\n'
    (tmp_path / "railguard.toml").write_text(toml)
    railguard.assert_sound(deck)
    settings = railguard.Settings()
    with pytest.raises(AssertionError):
        railguard.assert_sound(deck, settings)


def test_a_pyspice_circuit_is_reviewed():
    """A circuit built with PySpice is taken as it is."""
    from PySpice.Spice.Netlist import Circuit

    circuit = Circuit("gauge output stage")
    circuit.V("p", "vp", circuit.gnd, 12)
    circuit.V("n", "vn", circuit.gnd, -12)
    circuit.SinusoidalVoltageSource("in", "sense", circuit.gnd, amplitude=0.5, frequency=1000)
    circuit.R(1, "sense", "n", 10e3)
    circuit.R(2, "n", "out", 470e3)
    circuit.X("U1", "TL072", circuit.gnd, "n", "vp", "vn", "out")
    circuit.C("p", "vp", circuit.gnd, 100e-9)
    circuit.C("n", "vn", circuit.gnd, 100e-9)
    with pytest.raises(AssertionError, match="headroom-output"):
        railguard.assert_sound(circuit)
    assert isinstance(railguard.review(circuit).designs[0].not_checked, tuple)
    assert railguard.NotChecked is NotChecked
