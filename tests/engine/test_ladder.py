"""What is tried for an operating point, and that a guess of ngspice's is never taken for one."""

import shutil

import msgspec
import pytest

from railguard.analysis.design import analyse
from railguard.analysis.recognise import keeps_closed
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.engine.bench import bench_of
from railguard.engine.ladder import climb
from railguard.engine.ngspice import find
from railguard.engine.operating import simulate
from railguard.engine.requests import OperatingPoint, Transient
from railguard.errors import EngineError
from railguard.reviewing import review
from railguard.settings.model import Settings
from railguard.simulated import Ngspiced

pytestmark = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")

DEVICES = catalogue.load()
INVERTER = (
    "VIN in 0 SIN(2.5 {peak} 100)\nVR r 0 2.5\nR1 in n {ohms}\nR2 n out {ohms}\n"
    "XU1 r n vp 0 out AD8605\nVP vp 0 5\n"
)
RELAXATION = (
    "R1 out p 10k\nR2 p 0 10k\nR3 out n 47k\nC1 n 0 10n\nXU1 p n vp vn out TL072\n"
    "VP vp 0 12\nVN vn 0 -12\n"
)


def analysed(cards):
    """Return the design of some cards."""
    circuit = flatten(deck_from_text(f"gauge\n{cards}.end\n"), keeps_closed(DEVICES))
    return analyse(circuit, Settings(), DEVICES)


class Guessing:
    """ngspice whose operating points count as guesses in the first `guesses` runs that have one."""

    def __init__(self, guesses):
        self.engine, self.guesses, self.runs = find(), guesses, 0

    def run(self, deck, *requests):
        """Run, and call the operating point a guess."""
        found = self.engine.run(deck, *requests)
        self.runs += 1
        guessed = found.fallback or self.runs <= self.guesses
        return msgspec.structs.replace(found, fallback=guessed)


@pytest.mark.parametrize(("guesses", "how"), [(0, "as it is"), (1, "straight"), (2, "ramp")])
def test_each_rung_finds_the_level(guesses, how):
    """2.5 V at the output of an inverter round 2.5 V, whichever way it is found."""
    design = analysed(INVERTER.format(peak=1, ohms="10k"))
    bench = bench_of(design, DEVICES)
    found = climb(bench, Guessing(guesses))
    assert found.how == how
    assert found.levels[bench.output("XU1")] == pytest.approx(2.5, abs=2e-3)
    done = simulate(design, DEVICES, Guessing(guesses)).stages["XU1"]
    assert done.output.high == pytest.approx(3.5, abs=0.01)


def test_ngspices_own_last_resort_is_put_aside():
    """A hundred megohms round a fast CMOS amplifier end in the last resort: the log says so."""
    design = analysed(INVERTER.format(peak=0, ohms="100meg"))
    bench = bench_of(design, DEVICES)
    assert find().run(bench.decks["limited"], OperatingPoint()).fallback
    found = climb(bench, find())
    assert found.how != "as it is"
    assert found.levels[bench.output("XU1")] == pytest.approx(2.5, abs=5e-3)


def test_what_never_rests_has_no_operating_point():
    """A relaxation oscillator on a rail that comes up goes on swinging."""
    design = analysed(RELAXATION)
    with pytest.raises(EngineError, match="no operating point it would stand by"):
        climb(bench_of(design, DEVICES), Guessing(2))


def test_waves_from_a_guess_count_only_where_they_repeat():
    """A coupling of two seconds is still charging at the end of three periods."""
    settled = INVERTER.format(peak=1, ohms="10k")
    slow = "R9 r b 2meg\nC9 b 0 1u\nXU2 b q vp 0 q AD8605\nR8 q 0 10k\n"
    for cards, repeats in ((settled, True), (settled + slow, False)):
        design = analysed(cards)
        bench = bench_of(design, DEVICES)

        class FromZero(Guessing):
            """The start is no operating point at all: every capacitor is empty."""

            def run(self, deck, *requests):
                """Run without the first operating point."""
                if self.runs == 0:
                    requests = tuple(_FromZero(request) for request in requests)
                return super().run(deck, *requests)

        found = climb(bench, FromZero(1))
        assert (found.waves is not None) is repeats


class _FromZero:
    """A request whose transient starts with every capacitor empty."""

    def __init__(self, request):
        self.request = request
        self.card = request.card + (" uic" if isinstance(request, Transient) else "")

    def complete(self, plot):
        """As the request it stands for."""
        return self.request.complete(plot)


def test_a_review_says_that_there_was_no_operating_point():
    """The finding is left open, and the next circuit is simulated as ever."""
    clips = "VIN in 0 SIN(0 1 100)\nR1 in n 1k\nR2 n out 50k\nXU1 0 n vp vn out TL072\n"
    clips += "VP vp 0 12\nVN vn 0 -12\nC1 vp 0 100n\nC2 vn 0 100n\n"

    class Once(Guessing):
        """Guesses, and never rests, in the first circuit."""

        def run(self, deck, *requests):
            """Fail as a circuit without an operating point does."""
            if self.runs < 3:
                self.runs += 1
                raise EngineError("ngspice could not solve the circuit: singular matrix.")
            self.guesses = 0
            return super().run(deck, *requests)

    text = f"gauge\n{clips}.end\n"
    bad, good = review([text, text], engine=Ngspiced(Once(0), fill=False, confirm=True)).designs
    first = next(f for f in bad.findings if f.rule == "headroom-output")
    second = next(f for f in good.findings if f.rule == "headroom-output")
    assert "Not confirmed: there is no simulation" in first.message
    assert any("no operating point it would stand by" in r.message for r in bad.design.remarks)
    assert "Confirmed: ngspice reaches" in second.message
