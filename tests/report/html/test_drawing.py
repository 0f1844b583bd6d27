"""Drawings, rail scales and loops: what stands in the pictures is what the review worked out."""

import itertools
import math
import re
from xml.etree import ElementTree as ET

import pytest
from msgspec.structs import replace

from railguard.analysis.bound import Range
from railguard.report.html import bode, drawing, ruler, svg
from railguard.report.html.view import page
from railguard.report.html.wiring import Nets, wiring
from railguard.report.scale import Scale, input_scale, output_scale
from railguard.reviewing import review
from railguard.units import si
from tests.report.html.test_document import HOSTILE, ROOT, SOUND, STATION

BOARD = ROOT / "fixtures" / "board" / "gauge_board.cir"
SUPPLY = "VP vp 0 12\nVN vn 0 -12\n.end\n"


def stages_of(source):
    """Yield every stage of a design with its wiring."""
    design = review(source).designs[0].design
    nets = Nets(design)
    for stage in design.stages:
        yield stage, wiring(stage, nets), design


def texts(picture):
    """Return the texts of a picture."""
    return [node.text for node in picture.iter("text")]


def only_stage(cards):
    """Return the one stage of a small deck and its wiring."""
    ((stage, wired, _),) = stages_of(f"gauge\n{cards}\n{SUPPLY}")
    return stage, wired


@pytest.mark.parametrize("path", [STATION, *SOUND], ids=lambda p: p.stem)
def test_nothing_on_a_shown_net_is_left_out_in_silence(path):
    """Every element on a stage's nets is drawn once, with its value, or named beside."""
    for stage, wired, design in stages_of(path):
        shown = texts(drawing.drawn(stage, wired))
        assert drawing.short(stage.output.net) in shown
        schematic = {s.designator: s.schematic for s in design.stages}
        beside = {entry.rsplit(" at ", 1)[0] for entry in wired.beside}
        others = {other.output.net for other in design.stages} - {stage.output.net}
        own = {stage.output.net, stage.inputs.plus.net, stage.inputs.minus.net} - others
        for row in wired.around:
            element = row.element
            name = schematic.get(element.designator, element.designator)
            drawn = shown.count(drawing.short(element.designator))
            assert drawn <= 1
            if element.designator == stage.designator or not own & set(element.nets):
                continue
            assert drawn or name in beside, element.designator
            if drawn:
                assert drawing.short(drawing.value_of(element)) in ["", *shown]


def test_inverting_stage_is_wired_as_drawn():
    """Input resistor and feedback stand at the inverting input, ground at the other."""
    stage, wired = only_stage(
        "VIN in 0 SIN(0 1 1k)\nR1 in n 10k\nR2 n out 47k\nXU1 0 n vp vn out TL072"
    )
    (node,) = wired.minus
    assert [e.designator for b in node.feedback for e in b.elements] == ["R2"]
    assert [e.designator for e in node.onward.elements] == ["R1"]
    assert wired.minus_source == "in"
    assert wired.plus[0].net == "0"
    shown = texts(drawing.drawn(stage, wired))
    assert {"R1", "10 kΩ", "R2", "47 kΩ", "in", "out", "vp 12 V", "vn -12 V"} <= set(shown)


def test_sallen_key_has_its_feedback_at_the_middle_node():
    """The capacitor leads back to the node between the two resistors."""
    _, wired = only_stage(
        "VIN in 0 SIN(0 1 1k)\nR1 in a 10k\nR2 a p 10k\nC1 a out 10n\nC2 p 0 10n\n"
        "XU1 p out vp vn out TL072"
    )
    first, second = wired.plus
    assert [s.elements[0].designator for s in first.shunts] == ["C2"]
    assert [f.elements[0].designator for f in second.feedback] == ["C1"]
    assert wired.plus_source == "in"
    assert wired.wired


def test_elements_in_series_are_one_branch():
    """A resistor and a capacitor in the feedback stand behind each other."""
    _, wired = only_stage(
        "VIN in 0 SIN(0 1 1k)\nR1 in n 10k\nR2 n m 47k\nC2 m out 1n\nR3 n out 1meg\n"
        "XU1 0 n vp vn out TL072"
    )
    found = [[e.designator for e in b.elements] for b in wired.minus[0].feedback]
    assert sorted(found) == [["R2", "C2"], ["R3"]]


def test_stage_that_is_not_recognised_has_a_list_instead_of_a_drawing():
    """Its connections are listed, and open."""
    deck = f"gauge\nXU1 0 0 vp vn out TL072\nR1 out 0 10k\n{SUPPLY}"
    found = review(deck)
    one = found.designs[0]
    stages = tuple(replace(stage, topology="other") for stage in one.design.stages)
    one = replace(one, design=replace(one.design, stages=stages))
    found = replace(found, designs=(one,))
    view = page(found).designs[0]
    (shown,) = [s for s in (*view.subjects, *view.quiet) if s.device]
    assert not shown.drawing
    assert ("R1", "10 kΩ", "out, 0") in shown.connections


def test_pictures_are_wellformed_and_carry_no_style_of_their_own():
    """Hostile names are text; no attribute but the allowed ones stands on a drawing."""
    for stage, wired, _ in stages_of(HOSTILE):
        picture = drawing.drawn(stage, wired)
        again = ET.fromstring(str(svg.markup(picture)))
        for node in again.iter():
            assert node.tag in {
                "svg",
                "g",
                "path",
                "circle",
                "ellipse",
                "polygon",
                "polyline",
                "text",
            }
            assert not {"style", "href", "onload"} & set(node.attrib)
        assert "\u202e" not in "".join(t or "" for t in texts(again))


# ---------------------------------------------------------------- rail scale


def widths(picture, role):
    """Return the stretches of a role: (start, end) in the picture's units."""
    return [
        (float(n.get("x")), float(n.get("x")) + float(n.get("width")))
        for n in picture.iter("rect")
        if n.get("class") == role
    ]


def test_scale_shows_what_is_asked_where_it_lies():
    """From 1 V to 11 V of 0 V to 10 V: a tenth in, and beyond the upper rail."""
    scale = Scale(name="output", negative=0.0, positive=10.0, typical=Range(0.5, 9.5),
                  sure=Range(1.0, 9.0), asked=Range(1.0, 11.0))  # fmt: skip
    picture = ruler.ruler(scale, "Output")
    span = ruler.RIGHT - ruler.LEFT
    ((start, end),) = widths(picture, "asked-sure")
    assert start == pytest.approx(ruler.LEFT + 0.1 * span, abs=0.1)
    assert end == pytest.approx(ruler.LEFT + 0.9 * span, abs=0.1)
    ((start, end),) = widths(picture, "asked-typical")
    assert end - start == pytest.approx(0.05 * span, abs=0.1)
    beyond = widths(picture, "asked-beyond")
    assert beyond[0][0] == pytest.approx(ruler.LEFT + 0.95 * span, abs=0.1)
    assert beyond[-1][1] == pytest.approx(ruler.LEFT + 1.1 * span, abs=0.1)
    shown = texts(picture)
    assert {"0 V", "10 V", "1 V", "11 V"} <= set(shown)


@pytest.mark.parametrize("path", [STATION, *sorted((ROOT / "fixtures/faults").glob("*.cir"))],
                         ids=lambda p: p.stem)  # fmt: skip
def test_scale_and_its_words_hold_the_stages_numbers(path):
    """What is drawn is named for those who do not see it."""
    for stage, _, _ in stages_of(path):
        for make, part in ((output_scale, stage.output), (input_scale, stage.inputs)):
            scale = make(stage, worst=False)
            if scale is None or part.demand.low is None:
                continue
            spoken = ruler.ruler(scale, "Range").get("aria-label")
            assert si(stage.supply.positive, "V") in spoken
            assert f"{si(part.demand.high, 'V')}" in spoken or abs(part.demand.high) < 1e-6


# ---------------------------------------------------------------- loop


def curve(picture, kind):
    """Return the points of a curve."""
    (line,) = [n for n in picture.iter("polyline") if kind in n.get("class").split()]
    return [tuple(map(float, point.split(","))) for point in line.get("points").split()]


def test_loop_closes_where_the_curves_cross():
    """The mark stands on both curves: open-loop gain and noise gain are equal there."""
    stage, _ = only_stage(
        "VIN in 0 SIN(0 10m 1k)\nR1 in n 1k\nR2 n out 100k\nXU1 0 n vp vn out TL072"
    )
    picture = bode.bode(stage.loop, "Loop")
    mark = next(n for n in picture.iter("circle") if n.get("class") == "mark")
    x, y = float(mark.get("cx")), float(mark.get("cy"))
    for kind in ("open-loop", "noise-gain"):
        points = curve(picture, kind)
        (x0, y0), (x1, y1) = next(
            pair for pair in itertools.pairwise(points) if pair[0][0] <= x <= pair[1][0]
        )
        assert y0 + (y1 - y0) * (x - x0) / (x1 - x0) == pytest.approx(y, abs=1.5)
    assert f"closes at {si(stage.loop.crossover, 'Hz')}" in texts(picture)
    assert stage.loop.crossover == pytest.approx(3e6 / 101, rel=0.05)


def test_noise_gain_stands_at_its_decibels():
    """101 is 40.1 dB, a hundredth above the grid's line of 40."""
    stage, _ = only_stage(
        "VIN in 0 SIN(0 10m 1k)\nR1 in n 1k\nR2 n out 100k\nXU1 0 n vp vn out TL072"
    )
    picture = bode.bode(stage.loop, "Loop")
    label = next(n for n in picture.iter("text") if n.text == "40")
    level = {round(y, 1) for _, y in curve(picture, "noise-gain")[:10]}
    assert len(level) == 1
    assert level.pop() == pytest.approx(float(label.get("y")) - 4, abs=1.0)


def test_loop_without_a_sweep_is_not_drawn():
    """A comparator's loop is open: there is nothing to draw, and nothing is made up."""
    stage, _ = only_stage("VIN in 0 SIN(0 1 1k)\nXU1 in 0 vp vn out TL072\nR1 out 0 10k")
    assert stage.loop.points == ()
    assert bode.bode(stage.loop, "Loop") is None


def test_plots_hold_no_number_that_is_none():
    """Every coordinate of every picture is a number."""
    for path in SOUND[::3]:
        for stage, _, _ in stages_of(path):
            picture = bode.bode(stage.loop, "Loop")
            if picture is not None:
                found = re.findall(r"-?[\d.]+|nan|inf", str(svg.markup(picture)))
                assert all(math.isfinite(float(n)) for n in found if n.strip("."))


@pytest.mark.parametrize("path", [STATION, BOARD, *SOUND], ids=lambda p: p.stem)
def test_no_text_covers_another(path):
    """Names and values stay apart, whatever hangs on a stage's nets."""
    for stage, wired, _ in stages_of(path):
        boxes = []
        for node in drawing.drawn(stage, wired).iter("text"):
            width = 6.0 * len(node.text)
            share = {"start": 0.0, "middle": 0.5, "end": 1.0}[node.get("text-anchor")]
            left, base = float(node.get("x")) - share * width, float(node.get("y"))
            boxes.append((left, base - drawing.FONT * 0.75, left + width, base, node.text))
        for one, other in itertools.combinations(boxes, 2):
            apart = (
                one[2] <= other[0] or other[2] <= one[0] or one[3] <= other[1] or other[3] <= one[1]
            )
            assert apart, (stage.designator, one[4], other[4])
