"""Proposals: every one cures its finding and brings none; what no card cures is left to words."""

from pathlib import Path

import pytest
from eseries import eseries

from railguard.deck.numbers import read_number
from railguard.redline.proof import every
from railguard.redline.propose import causes, proposals, redline
from railguard.redline.reach import no_card
from railguard.redline.source import of_review
from railguard.reviewing import review, review_deck

ROOT = Path(__file__).parents[2]
FAULTS = sorted((ROOT / "fixtures" / "faults").glob("*.cir"))
BY_CARD = {
    "bias-no-dc-path", "decoupling-absent", "feedback-high", "feedback-low", "feedback-reversed",
    "headroom-input", "headroom-output", "netlist-value-suffix", "supply-missing",
    "supply-reversed",
}  # fmt: skip


def reviewed(path):
    """Review one deck."""
    return review(path, plugins=False).designs[0]


def keys(findings):
    """Return what names each finding."""
    return {(f.rule, f.designators, f.nets) for f in every(tuple(findings))}


@pytest.mark.parametrize("path", [p for p in FAULTS if p.stem in BY_CARD], ids=lambda p: p.stem)
def test_each_proposal_cures_its_finding_and_brings_none(path):
    """The edits, made here and reviewed here, do what the proposal says."""
    before = reviewed(path)
    source = of_review(before)
    found = proposals(before)
    assert path.stem in {p.finding.rule for p in found}
    for proposal in found:
        changed, _ = review_deck(source.patched(proposal.edits).deck(), before.design.settings)
        assert keys([proposal.finding]).isdisjoint(keys(changed.findings))
        assert keys(changed.findings) <= keys(before.findings)


@pytest.mark.parametrize("path", FAULTS, ids=lambda p: p.stem)
def test_what_no_card_cures_is_said_in_words(path):
    """Every finding is either cured or advised on, with the reason."""
    before = reviewed(path)
    found = redline(before)
    left = keys(a.finding for a in found.advice)
    for finding in causes(before):
        cured = any(finding.rule == g.rule for g in found.gone)
        assert cured or keys([finding]) & left
    if path.stem not in BY_CARD:
        assert found.advice[0].why.startswith("No card cures it: "), found.advice[0].why
        assert no_card(found.advice[0].finding, before.design)


def test_devices_named_pass_where_the_fitted_one_fails():
    """Each device, written onto the cards, leaves no finding of the limit that failed."""
    path = ROOT / "fixtures" / "faults" / "headroom-input.cir"
    (proposal,) = redline(reviewed(path)).proposals
    assert proposal.finding.rule == "headroom-input"
    assert len(proposal.instead) >= 3
    for device in proposal.instead:
        text = path.read_text().replace("LMC662C", device.code)
        after = review(text, plugins=False).designs[0]
        assert not [f for f in after.findings if f.rule == "headroom-input"]
        assert all(figure.given for figure in device.figures)


def test_devices_are_named_where_no_card_cures():
    """8 V in all on a device for 5.5 V: devices for more, each with the supply it takes."""
    path = ROOT / "fixtures" / "faults" / "supply-range.cir"
    (advice,) = redline(reviewed(path)).advice
    assert len(advice.devices) >= 3
    for device in advice.devices:
        assert device.figures[0].words == "total supply"
        text = path.read_text().replace("TLV9002", device.code)
        found = review(text, plugins=False).designs[0].findings
        assert not [f for f in found if f.rule == "supply-range"]


def test_a_sound_deck_is_left_alone():
    """Nothing is proposed where nothing is found."""
    found = redline(reviewed(ROOT / "fixtures" / "station" / "station.cir"))
    assert not found.proposals
    assert not found.files
    assert not found.held


COUPLED = """coupled sensor amplifier
VP vp 0 5
C1 vp 0 100n
CI in p 1u
VIN in 0 SIN(0 0.2 1k)
R1 n g 10k
CG g 0 10u
R2 n out 10k
XU1 p n vp 0 out MCP6001
RL out 0 20k
.end
"""


def test_a_return_on_a_single_supply_gets_a_level(tmp_path):
    """Ground would leave no room below, so a divider with a bypassed tap is proposed."""
    deck = tmp_path / "coupled.cir"
    deck.write_text(COUPLED)
    found = redline(reviewed(deck))
    (proposal,) = [p for p in found.proposals if p.finding.rule == "bias-no-dc-path"]
    assert "at their tap" in proposal.what
    assert "noise" in proposal.choice
    assert not found.remaining


def test_values_are_of_the_series_of_the_stated_tolerance(tmp_path):
    """5 % resistors get a value of E24, 1 % ones one of E96."""
    text = (ROOT / "fixtures" / "faults" / "headroom-output.cir").read_text()
    values = {}
    for tolerance in ("5%", "1%"):
        deck = tmp_path / f"deck{tolerance[0]}.cir"
        deck.write_text(text.replace("resistor 0.1%", f"resistor {tolerance}"))
        cured = [p for p in proposals(reviewed(deck)) if p.finding.rule == "headroom-output"]
        values[tolerance] = cured[0].edits[0].text.strip()
    for tolerance, key in (("5%", eseries.E24), ("1%", eseries.E96)):
        ohms = read_number(values[tolerance], "R").value
        assert eseries.find_nearest(key, ohms) == pytest.approx(ohms, rel=1e-9)
    assert values["5%"] != values["1%"]


def test_included_files_are_patched_where_the_card_stands(tmp_path):
    """The hunk is of the included file, and the main deck stays."""
    deck, inner = tmp_path / "main.cir", tmp_path / "stage.inc"
    body = (ROOT / "fixtures" / "faults" / "headroom-output.cir").read_text()
    moved = "R24    n6     o6     51k\n"
    deck.write_text(body.replace(moved, ".include stage.inc\n"))
    inner.write_text("* feedback of the level shifter\n" + moved)
    found = redline(reviewed(deck))
    assert [Path(c.file).name for c in found.files] == ["stage.inc"]
    assert found.gone[0].rule == "headroom-output"


def test_a_card_inside_a_subcircuit_is_patched_in_its_own_names(tmp_path):
    """A card added in a subcircuit uses the nets of that subcircuit."""
    deck = tmp_path / "deck.cir"
    deck.write_text(
        "level amplifier twice\nVP vp 0 12\nVN vn 0 -12\nC1 vp 0 100n\nC2 vn 0 100n\n"
        "C3 vp 0 100n\nC4 vn 0 100n\nVA a 0 SIN(0 1 1k)\n"
        ".subckt stage in out vp vn\nC1 in p 100n\nXU1 p out vp vn out TL072\n.ends\n"
        "X1 a o1 vp vn stage\nX2 a o2 vp vn stage\nR1 o1 0 10k\nR2 o2 0 10k\n.end\n"
    )
    before = reviewed(deck)
    assert {f.rule for f in causes(before)} >= {"bias-no-dc-path"}
    found = redline(before)
    (proposal,) = [p for p in found.proposals if p.finding.rule == "bias-no-dc-path"]
    assert len(proposal.cures) >= 2
    assert " p 0 " in proposal.edits[0].text


@pytest.mark.parametrize(("written", "text"), [("1M", "1meg"), ("20,5k", "20.5k"), ("4k7", "4.7k")])
def test_a_value_read_two_ways_is_written_in_one(tmp_path, written, text):
    """Suffix, decimal comma, RKM form."""
    deck = tmp_path / "deck.cir"
    deck.write_text(
        "follower on the logger's rail\nVP vp 0 5\nC1 vp 0 100n\nVIN in 0 SIN(2.5 1 1k)\n"
        f"XU1 in out vp 0 out MCP6001\nRL out 0 {written}\n.end\n"
    )
    cured = [p for p in redline(reviewed(deck)).proposals if p.finding.designators == ("RL",)]
    assert [p.edits[0].text for p in cured] == [text]


WAVE = """wave sensor, signal through a capacitor, level amplified
VDD vdd {ground} 5
C1 vdd {ground} 100n
C2 vdd {ground} 10u
R1 vdd mid 100k
R2 mid {ground} 100k
C3 mid {ground} 10u
R3 mid p 100k
C4 wave p 100n
VW wave {ground} SIN(0 0.05 200)
R4 out n 100k
R5 n {ground} 10k
XU1 p n vdd {ground} out MCP6001
RL out {ground} 10k
"""


@pytest.mark.parametrize("ground", ["0", "GND"])
def test_a_level_that_is_amplified_is_blocked_and_the_gain_kept(tmp_path, ground):
    """A capacitor in the ground leg: 10 / (2 pi 200 Hz 10 kilohm) = 0.8 uF; the gain stays 11."""
    path = tmp_path / "wave.cir"
    path.write_text(WAVE.format(ground=ground), encoding="utf-8")
    (found,) = [p for p in proposals(review(path).designs[0]) if "headroom-output" in p.reason]
    text = "".join(edit.text for edit in found.edits)
    assert "820n" in text
    assert "R4" not in found.what


TWO = """bridge amplifier of two amplifiers
VDD vdd 0 3.3
C1 vdd 0 100n
C2 vdd 0 10u
VP sp 0 SIN(1.0 0.2 5)
VN sn 0 1.0
VR ref 0 1.5
R1 ref n1 100k
R2 n1 o1 10k
R3 o1 n2 10k
R4 n2 out 100k
XU1A sn n1 vdd 0 o1 MCP6002
XU1B sp n2 vdd 0 out MCP6002
RL out 0 22k
"""


def test_one_resistor_of_a_balanced_four_is_not_changed(tmp_path):
    """3.7 V is asked of 3.3 V: R4 alone would cure it and cost the common-mode rejection."""
    path = tmp_path / "two.cir"
    path.write_text(TWO, encoding="utf-8")
    first = review(path).designs[0]
    assert "headroom-output" in {f.rule for f in first.findings}
    changed = {
        e.text for p in proposals(first) if "R4" in p.what or "R3" in p.what for e in p.edits
    }
    assert not changed


def test_both_resistors_of_a_difference_amplifier_go_together(tmp_path):
    """The one back from the output and its fellow to the reference: 6.2 V is asked of 5 V."""
    path = tmp_path / "shunt.cir"
    path.write_text(
        "battery current\nVDD vdd 0 5\nC1 vdd 0 100n\nC2 vdd 0 10u\nVB bat 0 3\nRS bat load 1\n"
        "IL load 0 SIN(1 0.24 5)\nR1 bat p 20k\nR2 p 0 100k\nR3 load n 20k\nR4 out n 100k\n"
        "XU1 p n vdd 0 out OPA197\nRL out 0 100k\n* railguard: tolerance resistor 0.01%\n",
        encoding="utf-8",
    )
    found = [p for p in proposals(review(path).designs[0]) if "gain" in p.choice]
    assert found
    for proposal in found:
        assert "R4" in proposal.what
        assert "R2" in proposal.what


DAC = """converter's output amplifier, 0 V to 8.2 V asked of 5 V
V5 v5 0 5
C1 v5 0 100n
C2 v5 0 10u
VDAC dac 0 SIN(2.048 2.048 100)
R1 out n 1k
R2 n 0 1k
XU1 dac n v5 0 out AD8605
RL out 0 10k
"""


def test_a_grave_fault_is_eased_where_a_small_one_stays(tmp_path):
    """No gain brings an output down to 0 V; that 8.2 V is asked of 5 V is mended all the same."""
    path = tmp_path / "dac.cir"
    path.write_text(DAC, encoding="utf-8")
    first = review(path).designs[0]
    found = redline(first)
    eased = next(p for p in found.proposals if p.left)
    assert (eased.finding.rule, eased.finding.severity) == ("headroom-output", "critical")
    assert {f.severity for f in eased.left} == {"minor"}
    assert not found.held
    assert not [p for p in proposals(first) if p.left]  # what is no cure is no single fix


def test_an_inverting_stage_on_ground_gets_a_level(tmp_path):
    """On a single supply half of what it inverts lies below ground."""
    path = tmp_path / "inverting.cir"
    path.write_text(
        "wave amplifier\nV1 vdd 0 5\nC1 vdd 0 100n\nC2 vdd 0 10u\nVIN in 0 SIN(0 0.1 1k)\n"
        "C4 in a 1u\nR3 a n 10k\nR4 out n 100k\nXU1 0 n vdd 0 out TLV9001\nC5 out oc 10u\n"
        "R5 oc 0 10k\n",
        encoding="utf-8",
    )
    found = redline(review(path).designs[0])
    (proposal,) = [p for p in found.proposals if p.finding.rule == "headroom-output"]
    assert "instead of ground" in proposal.what
    assert not found.held


def test_a_capacitor_at_an_output_is_parted_from_it():
    """What a sheet does not list is judged by the least there is, and a resistor cures it."""
    text = """capacitor at a buffer of the river gauge
VP vp 0 5
CP vp 0 100n
VIN level 0 SIN(1.5 1 10)
XU1 level out vp 0 out TLV9002
CL out 0 220n
RL out 0 100k
"""
    before = review(text, plugins=False).designs[0]
    assert {f.rule for f in before.findings if f.severity == "major"} == {"stability-phase-margin"}
    found = {p.finding.rule: p for p in proposals(before)}["stability-phase-margin"]
    assert found.what.startswith("Add R1 of ")
    assert "between the output of U1 and out" in found.what


SWAPPED = """amplifier of the river gauge, its inputs exchanged
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
VIN level 0 SIN(0 1.5 40)
R1 0 n 10k
R2 n out 10k
XU1 n level vp vn out OP27G
RL out 0 20k
"""


def test_what_a_stage_shows_once_it_works_was_there_before():
    """Nothing is judged of a loop that is turned round, so its resistors are seen only then."""
    before = review(SWAPPED, plugins=False).designs[0]
    found = {p.finding.rule: p for p in proposals(before)}["feedback-reversed"]
    assert found.what == "Swap the inputs of U1."
    assert [(f.rule, f.severity) for f in found.uncovered] == [("feedback-high", "remark")]
    whole = redline(before)
    assert [p.finding.rule for p in whole.proposals][:2] == ["feedback-reversed", "feedback-high"]
    assert not whole.remaining
    assert not whole.uncovered


def test_a_grave_fault_that_shows_only_then_is_no_cure():
    """With its inputs the right way round the output would be asked for more than its rail."""
    loud = SWAPPED.replace("SIN(0 1.5 40)", "SIN(0 9 40)")
    before = review(loud, plugins=False).designs[0]
    assert "feedback-reversed" not in {p.finding.rule for p in proposals(before)}


def test_a_deck_that_is_known_for_a_board_only_now_has_nothing_new():
    """The first capacitor on a rail tells a board, whose values are held to a series."""
    bare = """gauge buffer
VP raw 0 5
LFB1 raw vp 10u
CP raw 0 100n
RS level in 10.3k
VIN level 0 SIN(1.5 1 10)
XU1 in out vp 0 out TLV9001
RL out 0 100k
"""
    before = review(bare, plugins=False).designs[0]
    assert before.design.kind == "unstated"
    assert "netlist-value-series" not in {f.rule for f in every(before.findings)}
    found = [p for p in proposals(before) if p.finding.rule.startswith("decoupling")]
    assert {f.rule for p in found for f in p.uncovered} == {"netlist-value-series"}
    whole = redline(before)
    assert "netlist-value-series" in {p.finding.rule for p in whole.proposals}


@pytest.mark.parametrize(
    ("feedback", "what"),
    [
        ("Q1 n 0 out QN", "Add R2 of 1.4 kΩ between the output of U1 and the emitter of Q1."),
        ("Q1 n 0 e QN\nR2 e out 100", "R2 = 1.4 kΩ instead of 100 Ω."),
    ],
)
def test_a_logarithm_keeps_its_shape_and_gets_an_emitter_resistor(feedback, what):
    """What amplifies in its loop is damped; nothing is put between the inputs."""
    before = review(
        "logarithm of the turbidity meter\nVP vp 0 12\nVN vn 0 -12\nC1 vp 0 100n\n"
        f"C2 vn 0 100n\nVIN in 0 SIN(2 1.9 10)\nR1 in n 10k\n{feedback}\nC3 n out 47p\n"
        "XU1 0 n vp vn out OPA2134\nRL out 0 10k\n.model QN NPN(BF=200 IS=1e-14)\n",
        plugins=False,
    ).designs[0]
    found = next(p for p in proposals(before) if p.finding.rule == "stability-noise-gain")
    assert found.what == what
    assert {f.rule for f in found.cures} == {"stability-noise-gain", "stability-phase-margin"}
