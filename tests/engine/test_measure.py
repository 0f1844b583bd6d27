"""Macromodels written from known figures give those figures back.

The model is a textbook two-stage amplifier (transconductance with a hyperbolic tangent, one pole,
an output that follows through a resistance within headroom and current limits), authored for this
test; every number below is the figure it was built from.
"""

import math
import shutil

import msgspec
import pytest

from railguard.deck.files import deck_from_text
from railguard.devices.catalogue import load
from railguard.devices.swing import drop
from railguard.engine.entry import as_toml, entry
from railguard.engine.measure import BENCHES, measure
from railguard.engine.ngspice import find
from railguard.engine.specimen import specimen
from railguard.errors import EngineError, UsageError
from railguard.location import Location

needs_ngspice = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is missing")


class Known(msgspec.Struct, frozen=True):
    """Figures a macromodel is written from, SI; `slope_*` ohms of the saturated output."""

    gain: float
    bandwidth: float
    slew: float
    offset: float
    bias: float
    keep_high: float
    slope_high: float
    keep_low: float
    slope_low: float
    source: float
    sink: float
    quiescent: float
    low: float
    high: float


BIPOLAR = Known(
    1e5, 1e6, 0.4e6, 2e-3, -45e-9, 1.5, 20.0, 0.02, 80.0, 0.030, 0.015, 0.6e-3, 0.0, -1.5
)
CMOS = Known(1e6, 10e6, 6e6, 0.5e-3, 1e-12, 2e-3, 45.0, 2e-3, 40.0, 0.040, 0.045, 0.9e-3, -0.1, 0.1)


def written(known, name="gauge"):
    """Return the macromodel as netlist text."""
    gm = 1e-5
    pole = gm / (2 * math.pi * known.bandwidth)
    most = known.slew * pole
    source, sink = known.source * 1e3, known.sink * 1e3
    return f"""* {name}
.subckt {name} inp inn vcc vee out
Rid inp inn 2e9
Cid inp inn 2e-12
Ibp inp vee dc {known.bias!r}
Ibn inn vee dc {known.bias!r}
Bmid mid 0 v=0.5*(v(vcc)+v(vee))
Bpe pe 0 v=v(inp)-0.999*(max(v(inp)-v(vcc)-({known.high}),0)-max(v(vee)+({known.low})-v(inp),0))
Bne ne 0 v=v(inn)-0.999*(max(v(inn)-v(vcc)-({known.high}),0)-max(v(vee)+({known.low})-v(inn),0))
Bgm 0 g i={most!r}*tanh((v(pe)-v(ne)+{known.offset})*{gm / most!r})
R1 g mid {known.gain / gm!r}
C1 g 0 {pole!r}
Bha ha 0 v=(v(vcc)-v(out)-{known.keep_high})*{1e3 / known.slope_high!r}
Bla la 0 v=(v(out)-v(vee)-{known.keep_low})*{1e3 / known.slope_low!r}
Bih ih 0 v=0.5*(v(ha)+{source}-sqrt((v(ha)-{source})*(v(ha)-{source})+0.09))
Bil il 0 v=0.5*(v(la)+{sink}-sqrt((v(la)-{sink})*(v(la)-{sink})+0.09))
Bio io 0 v=max(min((v(g)-v(out))*16.6666667,v(ih)),-v(il))
Bup vcc out i=1m*max(v(io),0)
Bdn out vee i=1m*max(-v(io),0)
Bcl g 0 i=0.0003*(max(v(g)-v(out)-0.06*v(ih)-0.02,0)-max(v(out)-v(g)-0.06*v(il)-0.02,0))
Biq vcc vee i={known.quiescent}*tanh(max(v(vcc)-v(vee),0)*2.5)
.ends {name}
"""


def measured(text, supply, name="gauge", pins=()):
    """Measure a model and return its outcomes and the device made of them."""
    made = specimen(deck_from_text(text, "model.cir"), name, pins)
    outcomes = tuple(measure(made, find(), supply))
    table = entry(made, "model.cir", supply, outcomes)
    catalogue = load([(table, Location("measured.toml", 1))])
    return outcomes, catalogue.device(name)


@pytest.fixture(scope="module", params=[(BIPOLAR, 30.0), (BIPOLAR, 5.0), (CMOS, 5.0)])
def case(request):
    """A model's known figures, its supply, and what was measured."""
    known, supply = request.param
    return known, supply, *measured(written(known), supply)


@needs_ngspice
def test_no_bench_fails_on_a_sound_model(case):
    """Each bench gives its figures."""
    _known, _supply, outcomes, _device = case
    assert [outcome.bench for outcome in outcomes] == [name for name, _run in BENCHES]
    assert [outcome.failed for outcome in outcomes] == [""] * len(BENCHES)


@needs_ngspice
def test_figures_come_back_within_five_percent(case):
    """Offset, bias, supply current, limits, bandwidth, gain and slew rate."""
    known, supply, _outcomes, device = case
    within = {"rel": 0.05}
    assert device.offset_voltage.typical == pytest.approx(known.offset, **within)
    assert device.bias_current.typical == pytest.approx(abs(known.bias), **within)
    assert device.supply_current.typical == pytest.approx(known.quiescent, **within)
    assert device.gain_bandwidth.typical == pytest.approx(known.bandwidth, **within)
    assert device.open_loop_gain.typical == pytest.approx(known.gain, **within)
    assert device.slew_rate.typical == pytest.approx(known.slew, **within)
    room = supply / 2
    sourced = min(known.source, (room - known.keep_high) / known.slope_high)
    sunk = min(known.sink, (room - known.keep_low) / known.slope_low)
    assert device.source_current.typical == pytest.approx(sourced, **within)
    assert device.sink_current.typical == pytest.approx(sunk, **within)


@needs_ngspice
def test_swing_comes_back_within_twenty_millivolts(case):
    """The curve through the measured loads, at loads between them."""
    known, supply, _outcomes, device = case
    for ohms in (1e6, 20e3, 10e3, 5e3, 2e3):
        high = (supply / 2 - known.keep_high) / (ohms + known.slope_high)
        low = (supply / 2 - known.keep_low) / (ohms + known.slope_low)
        kept = known.keep_high + known.slope_high * high
        assert drop(device.swing_high, high, supply).typical == pytest.approx(kept, abs=0.02)
        kept = known.keep_low + known.slope_low * low
        assert drop(device.swing_low, low, supply).typical == pytest.approx(kept, abs=0.02)


@needs_ngspice
def test_the_input_range_comes_back(case):
    """Within 5 % of a volt: the step of the sweep and the servo's allowance."""
    known, _supply, _outcomes, device = case
    assert device.input_low.typical == pytest.approx(known.low, abs=0.05)
    assert device.input_high.typical == pytest.approx(known.high, abs=0.05)


@needs_ngspice
def test_nothing_measured_is_called_guaranteed(case):
    """A macromodel shows typical behaviour."""
    _known, _supply, _outcomes, device = case
    assert device.slew_rate.guaranteed is None
    assert all(point.guaranteed is None for point in device.swing_high + device.swing_low)


STIFF = """* an amplifier whose output knows no load
.subckt gauge p n vcc vee out
Rin p n 1e9
Bgm 0 g i=1e-6*tanh((v(p)-v(n))*10)
R1 g 0 1e9
C1 g 0 1.59e-12
Bout out 0 v=max(min(v(g),v(vcc)-1),v(vee)+1)
Rq vcc vee 20k
.ends
"""


@needs_ngspice
def test_a_model_without_load_dependence_is_reported_as_such():
    """And so is load current that comes from nowhere."""
    outcomes, device = measured(STIFF, 10.0)
    remarks = next(o.remarks for o in outcomes if o.bench.startswith("output swing"))
    assert any("positive rail does not depend on the load" in remark for remark in remarks)
    assert any("does not come from the negative supply pin" in remark for remark in remarks)
    assert drop(device.swing_high, 1e-3, 10.0).typical == pytest.approx(1.0, abs=0.02)
    assert "does not depend on the load" in device.notes


@needs_ngspice
def test_a_bench_that_fails_says_so_and_leaves_its_field_out():
    """A follower without open-loop gain has no gain-bandwidth product."""
    weak = STIFF.replace("R1 g 0 1e9", "R1 g 0 2e6").replace("tanh((v(p)-v(n))*10)", "(v(p)-v(n))")
    outcomes, device = measured(weak, 10.0)
    failed = {o.bench: o.failed for o in outcomes if o.failed}
    assert "the open-loop gain does not fall" in failed["gain-bandwidth product"]
    assert device.gain_bandwidth.typical is None


@needs_ngspice
def test_pins_taken_the_wrong_way_round_are_noticed():
    """The follower test stands before every other figure."""
    pins = ("in-", "in+", "v+", "v-", "out")
    outcomes, _device = measured(written(BIPOLAR), 30.0, pins=pins)
    assert all("in the order taken?" in outcome.failed for outcome in outcomes)


BOYLE = """* a model of the JFET kind with polynomial sources, own numbers
.subckt gauge 1 2 3 4 5
c1 11 12 3.5e-12
c2 6 7 15e-12
dc 5 53 dx
de 54 5 dx
dlp 90 91 dx
dln 92 90 dx
dp 4 3 dx
egnd 99 0 poly(2) (3,0) (4,0) 0 .5 .5
fb 7 99 poly(5) vb vc ve vlp vln 0 4.7e6 -5e6 5e6 5e6 -5e6
ga 6 0 11 12 280e-6
gcm 0 6 10 99 8.9e-9
iss 3 10 dc 195e-6
hlim 90 0 vlim 1k
j1 11 2 10 jx
j2 12 1 10 jx
r2 6 9 100e3
rd1 4 11 3.5e3
rd2 4 12 3.5e3
ro1 8 5 150
ro2 7 99 150
rp 3 4 10e3
rss 10 99 1.0e6
vb 9 0 dc 0
vc 3 53 dc 2.2
ve 54 4 dc 2.2
vlim 7 8 dc 0
vlp 91 0 dc 25
vln 0 92 dc 25
.model dx d(is=800e-18)
.model jx pjf(is=15e-12 beta=270e-6 vto=-1)
.ends
"""


@needs_ngspice
def test_a_model_of_the_classic_kind_is_measured():
    """Slew rate is tail current over compensation capacitance, 13 V/us; the limit is 25 mA."""
    outcomes, device = measured(BOYLE, 30.0)
    assert [o.failed for o in outcomes] == [""] * len(BENCHES)
    assert device.slew_rate.typical == pytest.approx(195e-6 / 15e-12, rel=0.05)
    assert device.source_current.typical == pytest.approx(25e-3, rel=0.05)


@pytest.mark.parametrize(
    ("line", "words"),
    [
        ("Bout out 0 v=limit(v(g),-5,5)", "its relation (limit(v(g),-5,5)) is not made of"),
        ("Bout out 0 v=v(g)*shell(1)", "is not made of plain numbers"),
        ("D1 out 0 nowhere", "its model nowhere is not in the file"),
    ],
)
def test_what_is_not_plain_is_never_handed_to_the_simulator(line, words):
    """The model is refused with the element's name and the reason."""
    text = STIFF.replace("Bout out 0 v=max(min(v(g),v(vcc)-1),v(vee)+1)", line)
    with pytest.raises(EngineError, match="cannot be simulated") as refused:
        specimen(deck_from_text(text, "model.cir"), "gauge")
    assert words in refused.value.what


def test_a_name_that_is_not_in_the_file_is_an_error():
    """The message names both."""
    with pytest.raises(UsageError, match=r"model\.cir defines no subcircuit other"):
        specimen(deck_from_text(STIFF, "model.cir"), "other")


def test_a_model_without_supply_pins_is_no_specimen():
    """Three ports make an ideal amplifier, which has no limits to measure."""
    ideal = "* ideal\n.subckt gauge p n out\nE1 out 0 p n 1e6\n.ends\n"
    with pytest.raises(UsageError, match="an op-amp with supply pins is needed"):
        specimen(deck_from_text(ideal, "model.cir"), "gauge")


def test_an_entry_is_written_as_a_users_table():
    """Strings quoted, lists and tables inline, empty fields left out."""
    table = {
        "family": 'a"b',
        "notes": "",
        "slew_rate": {"typical": 4e5},
        "swing_high": [{"amps": 1e-3, "typical": 0.1}],
    }
    assert as_toml(table) == (
        '[[devices]]\nfamily = "a\\"b"\nslew_rate = { typical = 400000.0 }\n'
        "swing_high = [{ amps = 0.001, typical = 0.1 }]\n"
    )
