"""Odd cards, what they mean to SPICE, and what reading makes of them.

Each row is the fragment between a title line with `V1 a 0 5` and `.end`. What SPICE takes a value
for was measured with ngspice 39, batch mode, default compatibility; the ngspice manual (chapter on
circuit description), the LTspice reference (SPICE syntax) and the Xyce reference guide say the rest.
Two readings differ from SPICE's on purpose: where the author plainly meant another value (1M, 4F,
1X, 2k2) that one is taken, and SPICE's own stands beside it.
"""

import pytest

from railguard.circuit.flatten import flatten
from railguard.deck.encoding import decode
from railguard.deck.files import deck_from_text, read_deck

# Number, cards, elements with their value and nets, rules with the reading of SPICE.
ROWS = (
    (6, "  R1 a 0 1k", "R1=1000", ""),
    (7, "\tR1\ta\t0\t1k", "R1=1000", ""),
    (8, "  * R1 a 0 1k", "", ""),
    (9, ";R1 a 0 1k", "", ""),
    (10, "R1 a 0 1k;note 5%", "R1=1000", ""),
    (11, "R1 a 0 1k $ note", "R1=1000", ""),
    (12, "R1 a$b 0 1k", "R1=1000 a$b 0", ""),
    (13, "R1 $G_VCC 0 1k", "R1=1000 $G_VCC 0", "other-dialect"),
    (14, "R1 a 0 1k // note", "R1=1000", "other-dialect"),
    (15, "R1 a//b 0 1k", "R1=1000 a//b 0", "other-dialect"),
    (16, "# R1 a 0 1k", "", "other-dialect"),
    (17, "R1 a 0\n* remark\n\n+ 1k", "R1=1000", ""),
    (18, "R1 a 0 1\n+5", "R1=1", "value-second-number"),
    (19, "R1 a 0\n+* remark\n+ 1k", "R1=1000", "continuation"),
    (20, "R1 a 0 1k\n+", "R1=1000", ""),
    (21, "R1 a 0 \\\\\n1k", "R1=1000", ""),
    (22, "R1 a 0 1k * 5%", "R1=1000", "value-second-number"),
    (23, "R1 a 0 1k\n.end\nR2 a 0 2k", "R1=1000", "end"),
    (24, ".include x.inc\n+ m=2", "", "continuation include"),
    (25, ".control\nR7 a 0 1\n.endc", "", ""),
    (30, "C1 a 0 1µ", "C1=1e-6", ""),
    (31, "C1 a 0 1μ", "C1=1e-6", "value-suffix"),
    (32, "R1 a 0 10kΩ", "R1=10000", ""),
    (36, "C1 a 0 1�", "C1=None", "encoding value-form"),
    (37, "R1 Ωx 0 1k\nR2 μx 0 1k", "R1=1000 Ωx 0; R2=1000 μx 0", ""),
    (38, "R1 a 0 1MEG", "R1=1e6", ""),
    (39, "R1 a 0 1M", "R1=1e6", "value-suffix:1e-3"),
    (40, "C1 a 0 4Farads", "C1=4", "value-suffix:4e-15"),
    (41, "R1 a 0 1mil", "R1=25.4e-6", ""),
    (42, "R1 a 0 {1mil}", "R1=25.4e-6", "other-dialect"),
    (43, "R1 a 0 1X", "R1=1e6", "value-suffix:1"),
    (44, "I1 a 0 1A", "I1=1", ""),
    (45, "R1 a 0 2k2", "R1=2200", "value-suffix:2000"),
    (46, "R1 a 0 4R7", "R1=4.7", "value-suffix:4"),
    (47, "R1 a 0 R47", "R1=0.47", "value-suffix:0"),
    (48, "R1 a 0 2M2", "R1=2.2e6", "value-suffix:2e-3"),
    (49, "R1 a 0 {2k2}", "R1=None", "expression"),
    (50, "R1 a 0 4,7k", "R1=4700", "value-form:7000"),
    (51, "C1 a 0 0,1u", "C1=1e-7", "value-form:1e-6"),
    (52, "C1 a 0 10 uF", "C1=1e-5", "value-form"),
    (53, "R1 a 0 10k 5%", "R1=10000", "value-second-number:5"),
    (54, "R1 a 0 10k 0603", "R1=10000", "value-second-number:603"),
    (55, "C1 a 0 10u 16V", "C1=1e-5", "value-second-number:16"),
    (56, "R1 a 0 1.5e3k", "R1=1.5e6", ""),
    (57, "R1 a 0 1e-3", "R1=1e-3", ""),
    (58, "R1 a 0 1E-3m", "R1=1e-6", ""),
    (59, "R1 a 0 1D3", "R1=1000", "other-dialect:1000"),
    (60, "C1 a 0 1D-6", "C1=1e-6", "value-suffix:-6"),
    (61, "R1 a 0 1e", "R1=1", "value-form:1"),
    (62, "R1 a 0 1.2.3", "R1=None", "value-form:1.2"),
    (63, "R1 a 0 0x10", "R1=None", "value-form:0"),
    (64, "V2 b 0 +15V", "V2=15", ""),
    (65, "R1 a 0 .5k\nR2 a 0 5.", "R1=500; R2=5", ""),
    (66, "R1 a 0 inf", "R1=None", "value-form"),
    (67, "R1 in+ in- 1k", "R1=1000 in+ in-", ""),
    (68, "R1 3V3 1k 1k", "R1=1000 3V3 1k", ""),
    (69, "R1 a 1k", "R1=None a", "node-count"),
    (70, "R1 a GND 1k", "R1=1000 a 0", ""),
    (71, "R1 a gnd! 1k", "R1=1000 a gnd!", "ground"),
    (72, "R1 a 00 1k", "R1=1000 a 00", "ground"),
    (73, "R1 a AGND 1k", "R1=1000 a AGND", ""),
    (74, ".subckt s p gnd\nR1 p gnd 1k\n.ends\nX1 a b s", "X1.R1=1000 a b", "other-dialect"),
    (75, "R1 a Net-(U1-Pad3) 1k", "R1=1000 a Net-(U1-Pad3)", ""),
    (76, "R1 (a,0) 1k", "R1=1000 a 0", ""),
    (77, "R1,a,0,1k", "R1=1000 a 0", ""),
    (78, "R1 a b=c 1k", "R1=None a", "node-count"),
    (79, "R1 a 0 1k\nr1 a 0 2k", "R1=1000", "duplicate"),
    (80, "1R a 0 1k", "1R=None a 0", "card"),
    (81, "R1 a 0 R = 2k", "R1=2000", ""),
    (82, "R1 a 0 2k tc=1m,2u", "R1=2000", ""),
    (83, "R1 a 0 2k tc=1m 2u", "R1=2000", ""),
    (84, "R1 a 0 rm\n.model rm r(r=1k)", "R1=1000", ""),
    (85, "R1 a 0 rm 2k\n.model rm res(r=2)", "R1=2000", "other-dialect"),
    (86, "R1 a 0 1k R=2k", "R1=2000", "value-second-number"),
    (87, "R1 a 0 'V(a)*1k'", "R1=None", ""),
    (88, "R1 a 0 DNP", "R1=None", ""),
    (89, "C1 a 0 1u cm\n.model cm c(tc1=0)", "C1=1e-6", ""),
    (90, "L1 a b 1m Rser=0.1 Rpar=1k", "L1=1e-3", ""),
    (91, "D1 a 0 1N4148 2\n.model 1N4148 D", "D1=None a 0", ""),
    (92, "Q1 c b e 2N3904\n.model 2N3904 NPN", "Q1=None c b e", ""),
    (93, "Q1 c b e s qm 2.0\n.model qm npn", "Q1=None c b e s", ""),
    (94, "Q1 c b e [0] qm\n.model qm npn", "Q1=None c b e 0", ""),
    (95, "M1 d g s mm\n.model mm nmos", "M1=None d g s", "node-count"),
    (96, "V2 b 0", "V2=0", ""),
    (97, "V2 b 0 AC 1 DC 5 SIN(0 1 1k)", "V2=5", ""),
    (98, "V2 b 0 SINE(2,1,1k)", "V2=2", ""),
    (99, "V2 b 0 PULSE 4 5 1n 1n 1n 1u 2u", "V2=4", ""),
    (100, "V2 b 0 PWL((0,1) (1u,2))", "V2=1", ""),
    (101, "V2 b 0 PWL(0 1 1u)", "V2=0", "source"),
    (102, "V2 b 0 5 dc 6", "V2=5", "source"),
    (103, "E1 b 0 POLY ( 2 ) (a,0) (c,0) 0 1 1", "E1=None b 0", ""),
    (104, "E1 b 0 TABLE {V(a)} ((0 0) (10 20))", "E1=None b 0", ""),
    (105, "E1 b 0 a 0 table=(0,0,10,20)", "E1=None b 0", ""),
    (106, "B1 b 0 V = V(in+) \n+ * 2", "B1=None b 0", ""),
    (107, "X1 a 0 s PARAMS: r = {1==1 ? 2k : 3k}\n.subckt s p q r=1k\nR1 p q {r}\n.ends", "X1.R1=2000", ""),
    (108, "X1 a s\n.subckt s p q\n.ends", "X1=None a", "node-count"),
    (109, "X§U1 a 0 s ;§pnba IN)OUT\n.subckt s p q\nR1 p q 1k\n.ends", "X§U1.R1=1000 a 0", ""),
    (110, "X1 a s\n.subckt s p OPTIONAL: q=0 PARAMS: r=1k\nR1 p q {r}\n.ends", "X1.R1=1000 a 0", ""),
    (111, ".param b={a*2}\n.param a=1k\nR1 a 0 {b}", "R1=2000", ""),
    (112, ".param b={c} c={b}", "", "parameter"),
    (113, ".param b=1k, c=2\nR1 a 0 {b*c}", "R1=2000", "other-dialect"),
    (114, "X1 a 0 o\n.subckt o p q\n.param h=2k\nX2 p q i\n.ends\n.subckt i p q\nR1 p q {h}\n.ends", "X1.X2.R1=2000", "other-dialect"),
    (115, "R1 a 0 {2^3^2}", "R1=64", "other-dialect"),
    (116, "R1 a 0 {-2**2 + 5}", "R1=1", ""),
    (117, "R1 a 0 {1/0}", "R1=None", "expression"),
    (118, ".model d1 d(is=1e-14,rs=10\nD1 a 0 d1", "D1=None a 0", "card"),
    (120, "X1 a 0 s\n.subckt s p q\nR1 p q 1k\n.END", "X1.R1=1000", "end"),
)  # fmt: skip


def read(text):
    """Flatten a whole deck's text."""
    return flatten(deck_from_text(text, "deck.cir"))


def value_of(element):
    """Return what an element is worth: its value, or its level for a source."""
    return element.source.level if element.source is not None else element.value


@pytest.mark.parametrize(("number", "cards", "elements", "rules"), ROWS, ids=lambda x: str(x)[:20])
def test_fragment_reads_as_stated(number, cards, elements, rules):
    """Elements, values, nets; and what is told, no more and no less."""
    found = read(f"title\nV1 a 0 5\n{cards}\n.end\n")
    assert found.title == "title"
    others = [e for e in found.elements if e.designator != "V1"]
    wanted = [w.strip().split() for w in elements.split(";") if w.strip()]
    assert [e.designator for e in others] == [w[0].split("=")[0] for w in wanted]
    for element, (head, *nets) in zip(others, wanted, strict=True):
        value = head.split("=")[1]
        meant = None if value == "None" else pytest.approx(float(value))
        assert value_of(element) == meant
        assert not nets or list(element.nets) == nets
    told = {p.rule.removeprefix("netlist-"): p for p in found.problems}
    assert set(told) == {rule.split(":")[0] for rule in rules.split()}
    for rule, _, spice in (r.partition(":") for r in rules.split()):
        if spice:
            assert told[rule].spice_value == pytest.approx(float(spice))


def test_title_that_looks_like_a_card():
    """1: the element on the title line is no part of the circuit, and that is told."""
    found = read("R9 a 0 1k\nV1 a 0 5\n.end")
    assert found.title == "R9 a 0 1k"
    assert [e.designator for e in found.elements] == ["V1"]
    assert [p.rule for p in found.problems] == ["netlist-title"]


def test_blank_title():
    """2: a blank first line is the title."""
    found = read("\nV1 a 0 5\nR1 a 0 1k\n.end")
    assert (found.title, len(found.elements), found.problems) == ("", 2, ())


def test_continuation_of_the_title():
    """3: it continues nothing."""
    found = read("title\n+ R9 a 0 1k\nV1 a 0 5")
    assert [e.designator for e in found.elements] == ["V1"]
    assert [(p.rule, p.location.line) for p in found.problems] == [("netlist-continuation", 2)]


def test_title_card():
    """4: the last .title is the title."""
    assert read("old\n.title new name\nV1 a 0 5").title == "new name"


def test_library_has_no_title(tmp_path):
    """5: a file of definitions begins with a card."""
    path = tmp_path / "op.sub"
    path.write_text(".subckt amp p m o\nR1 p m 1k\n.ends\n")
    deck = read_deck(path)
    assert "amp" in flatten(deck).subcircuits
    assert "library" in deck.remarks[0].message


@pytest.mark.parametrize(
    ("data", "told"),
    [
        (b"\xef\xbb\xbf" + b"t\nR1 a 0 1k\nV1 a 0 5\n", ""),
        (b"\xff\xfe" + "t\nR1 a 0 1k\nV1 a 0 5\n".encode("utf-16-le"), "UTF-16"),
        ("t\nR1 a 0 1k\nV1 a 0 5\n".encode("utf-16-le"), "UTF-16"),
        (b"t\rR1 a 0 1k\rV1 a 0 5\r", ""),
        (b"t\r\r\nR1 a 0\r\r\n+ 1k\r\r\nV1 a 0 5\r\r\n\x1a", ""),
    ],
)
def test_bytes(tmp_path, data, told):
    """26 to 28 and 35: marks, UTF-16, line ends of every kind, a Ctrl-Z."""
    path = tmp_path / "deck.cir"
    path.write_bytes(data)
    deck = read_deck(path)
    found = flatten(deck)
    assert {e.designator: value_of(e) for e in found.elements} == {"R1": 1000.0, "V1": 5.0}
    assert found.title == "t"
    assert found.problems == ()
    assert [told in r.message for r in deck.remarks] == ([True] if told else [])


def test_micro_sign_of_one_byte(tmp_path):
    """29: 0xB5, as Windows programs write it."""
    path = tmp_path / "deck.cir"
    path.write_bytes(b"t\nV1 a 0 5\nC1 a 0 1\xb5\n")
    deck = read_deck(path)
    assert flatten(deck).elements[1].value == pytest.approx(1e-6)
    assert "Windows-1252" in deck.remarks[0].message
    assert decode(b"\x81\x8d")[0] == "\x81\x8d"  # bytes cp1252 leaves undefined


@pytest.mark.parametrize(
    ("cards", "told"),
    [
        ("R1\u00a0a 0 1k", "blanks"),
        ("R1 a 0 1k\x00", "NUL"),
        ("R1 a\u200b 0 1k", "without width"),
        ("R1 a 0 \u201c1k\u201d", "quotes"),
    ],
)
def test_look_alikes(cards, told):
    """33, 34: characters that stand for plain ones are replaced, and that is told."""
    found = read(f"t\nV1 a 0 5\n{cards}\nR2 a 0 1k\n")
    assert [(e.designator, e.nets) for e in found.elements[1:]] == [
        ("R1", ("a", "0")),
        ("R2", ("a", "0")),
    ]
    assert found.elements[1].value == 1000.0
    assert [p.rule for p in found.problems] == ["netlist-encoding"]
    assert told in found.problems[0].message


def test_library_sections(tmp_path):
    """119: only the section that is asked for."""
    (tmp_path / "l.lib").write_text(".lib tt\nR1 a 0 1k\n.endl\n.lib ff\nR2 a 0 2k\n.endl\n")
    (tmp_path / "deck.cir").write_text("t\nV1 a 0 5\n.lib 'l.lib' FF\n")
    found = flatten(read_deck(tmp_path / "deck.cir"))
    assert [e.designator for e in found.elements] == ["V1", "R2"]
    assert found.problems == ()


def test_relations_keep_their_nets():
    """97, 103 to 106, 109: what steers a source, its probe, and pins named behind a card."""
    cards = (
        "V2 b 0 AC 1 DC 5 SIN(0 1 1k)\nE1 b 0 POLY ( 2 ) (a,0) (c,0) 0 1 1\n"
        "E2 b 0 TABLE {V(a)} ((0 0) (10 20))\nE3 b 0 a 0 table=(0,0,10,20)\n"
        "B1 b 0 V = V(in+)\n+ * 2\nX§U1 a 0 nowhere ;§pnba IN)OUT"
    )
    found = {e.designator: e for e in read(f"t\nV1 a 0 5\n{cards}\n").elements}
    assert found["V2"].source.ac == (1.0, 0.0)
    assert found["V2"].source.wave.frequency == 1000.0
    assert found["E1"].control.nets == ("a", "0", "c", "0")
    assert found["E2"].control.nets == ("a",)
    assert found["E3"].control.nets == ("a", "0")
    assert found["B1"].control.nets == ("in+",)
    assert found["B1"].control.text == "V(in+) * 2"
    assert found["X§U1"].pin_notes == ("IN", "OUT")


def test_models_on_cards():
    """84, 89, 91, 93, 118: model names, areas, parameters of an unclosed .model."""
    cards = (
        "C1 a 0 1u cm\n.model cm c(tc1=0)\nD1 a 0 1N4148 2\n.model 1N4148 D\n"
        "Q1 c b e s qm 2.0\n.model qm npn\nR1 a 0 2k tc=1m,2u\nL1 a b 1m Rser=0.1 Rpar=1k\n"
        "R2 a 0 DNP\n.model d1 d(is=1e-14,rs=10\nD2 a 0 d1"
    )
    circuit = read(f"t\nV1 a 0 5\n{cards}\n")
    found = {e.designator: e for e in circuit.elements}
    assert (found["C1"].model, found["D1"].model, found["Q1"].model) == ("cm", "1N4148", "qm")
    assert (found["D1"].text, found["Q1"].text) == ("2", "2.0")
    assert found["R1"].parameters == {"tc1": 1e-3, "tc2": 2e-6}
    assert found["L1"].parameters == {"rser": 0.1, "rpar": 1000.0}
    assert not found["R2"].fitted
    assert circuit.models["d1"].parameters == {"is": 1e-14, "rs": 10.0}
