"""A stage drawn: symbols and lines by schemdraw, names and values from the netlist.

The amplifier stands right, its two input chains run left, the upper one raised above the lower by
as much as its shunts need, so that no wire crosses another. Feedback runs over the upper chain
and under the lower one.

schemdraw reads markup in labels, so it is given none: names and values are put into the finished
picture, where they are text and nothing else.
"""

import itertools
from collections.abc import Iterator, Sequence
from typing import Any, Literal
from xml.etree import ElementTree as ET

from railguard.analysis.stage import Stage
from railguard.circuit.model import GROUND, Element
from railguard.report.html import svg
from railguard.report.html.wiring import Branch, Node, Wiring
from railguard.report.visible import visible
from railguard.units import si

LONGEST_LABEL = 14
LEAD = 0.8
ELEMENT = 2.2
"""Length of one element with its leads, in units of the drawing."""

GAP = 0.8
"""Room between the texts beside a vertical element and whatever stands next, its own half width
included."""

ABOVE = 0.47
"""Distance of an element's name and value from its axis."""

STEP = 1.6
"""Distance of feedback lines, with the texts on both sides of their elements."""

PIN = 0.625
TIP = 2.165
OUT = 3.3
"""Where the op-amp's pins, its tip and the output's node stand; its back is at zero."""

POINTS_A_UNIT = 36.0
FONT, LETTER, MARGIN = 11.5, 6.6, 4.0
"""Points: the letters' size, the width the widest of them takes on average, room at the edges."""

_STYLES = ("stroke", "fill", "stroke-width", "stroke-linecap", "stroke-linejoin")
_TAGS = ("g", "path", "circle", "ellipse", "polygon", "polyline")
_PLACES = ("d", "points", "cx", "cy", "r", "rx", "ry", "transform")
_UNITS = {"R": "Ω", "C": "F", "L": "H"}


def drawn(stage: Stage, wired: Wiring) -> ET.Element:
    """Return the picture of one stage."""
    return _Drawing(stage, wired).picture()


def value_of(element: Element) -> str:
    """Return an element's value as on a schematic: `10 kΩ`, `1N4148`, else what its card says."""
    if element.kind in _UNITS and element.value is not None:
        return si(element.value, _UNITS[element.kind])
    if element.source is not None and element.source.dc is not None:
        return si(element.source.dc, "A" if element.kind == "I" else "V")
    return element.model or element.text


def short(text: str) -> str:
    """Return a text that fits beside a symbol; its middle gives way."""
    shown = visible(text)
    if len(shown) <= LONGEST_LABEL:
        return shown
    return f"{shown[: LONGEST_LABEL - 7]}…{shown[-6:]}"


Point = tuple[float, float]
Anchor = Literal["start", "middle", "end"]


class _Drawing:
    def __init__(self, stage: Stage, wired: Wiring) -> None:
        import schemdraw
        from schemdraw import elements

        self.stage, self.wired = stage, wired
        self.symbols = elements
        self.texts: list[tuple[str, Point, Anchor]] = []
        self.sheet = schemdraw.Drawing(canvas="svg", show=False)
        self.sheet.config(color="currentColor", lw=1.5)
        self.compose()
        self.raw = bytes(self.sheet.get_imagedata("svg"))

    # ---------------------------------------------------------------- pieces

    def line(self, *points: Point) -> None:
        for start, end in itertools.pairwise(points):
            if start != end:
                self.sheet.add(self.symbols.Line().endpoints(start, end))

    def dot(self, at: Point, *, open_: bool = False) -> None:
        self.sheet.add(self.symbols.Dot(open=open_, radius=0.07).at(at))

    def text(self, text: str, at: Point, anchor: Anchor = "start") -> None:
        if text:
            self.texts.append((text, at, anchor))

    def element(self, element: Element, start: Point, end: Point, *, forward: bool) -> None:
        """Draw one element between two points; `forward` where its first net is at the start."""
        ends = (start, end) if forward else (end, start)
        self.sheet.add(self.symbol(element).endpoints(*ends))
        x, y = (start[0] + end[0]) / 2, (start[1] + end[1]) / 2
        name, value = short(element.designator), short(value_of(element))
        if start[1] == end[1]:
            self.text(name, (x, y + ABOVE), "middle")
            self.text(value, (x, y - ABOVE), "middle")
        else:
            side = x + (0.55 if element.kind == "L" else 0.4)
            self.text(name, (side, y + 0.2))
            self.text(value, (side, y - 0.2))

    def symbol(self, element: Element) -> Any:  # noqa: ANN401 - schemdraw's own classes
        made = {
            "R": self.symbols.ResistorIEC,
            "C": self.symbols.Capacitor,
            "L": self.symbols.Inductor2,
            "link": self.symbols.FuseIEC,
            "D": self.symbols.Diode,
            "I": self.symbols.SourceI,
            "V": self.symbols.SourceV,
            "battery": self.symbols.BatteryCell,
        }
        return made[element.kind]()

    def branch(self, branch: Branch, start: Point, end: Point) -> None:
        """Draw elements in series, evenly spaced on a straight line."""
        count, net = len(branch.elements), branch.start
        for i, element in enumerate(branch.elements):
            a, b = _between(start, end, i / count), _between(start, end, (i + 1) / count)
            self.element(element, a, b, forward=element.nets[0] == net)
            net = element.nets[1] if element.nets[0] == net else element.nets[0]

    def shunt(self, branch: Branch, top: Point) -> None:
        """Draw a branch downwards, and what it ends on."""
        end = (top[0], top[1] - ELEMENT * 0.8 * len(branch.elements))
        self.branch(branch, top, end)
        if branch.end == GROUND:
            self.sheet.add(self.symbols.Ground().at(end))
        else:
            self.dot(end, open_=True)
            self.text(short(branch.end), (end[0], end[1] - 0.3), "middle")

    # ---------------------------------------------------------------- layout

    def compose(self) -> None:
        wired = self.wired
        over = bool(wired.plus[-1].onward) and not wired.minus[-1].onward
        top, bottom = (wired.plus, wired.minus) if over else (wired.minus, wired.plus)
        top_source, bottom_source = (
            (wired.plus_source, wired.minus_source)
            if over
            else (wired.minus_source, wired.plus_source)
        )
        amplifier = self.symbols.Opamp(sign=False)
        self.sheet.add(amplifier.at((0, PIN)).anchor("in1").right())
        self.text("+" if over else "−", (0.3, PIN), "middle")
        self.text("−" if over else "+", (0.3, -PIN), "middle")
        self.supplies()
        raised = PIN + (_depth(top) + 0.9 if _depth(top) else 0.0)
        self.rise(raised)
        lines = self.chain(top, top_source, raised)
        heights = self.feedback(lines, raised, max(raised + 1.2, 2.7), STEP)
        if wired.wired and not over:
            heights.append(self.wire_back(raised, max(raised + 1.2, 2.7)))
        lines = self.chain(bottom, bottom_source, -PIN)
        lowest = -PIN - (_depth(bottom) + 0.6 if _depth(bottom) else 0.9)
        depths = self.feedback(lines, -PIN, min(lowest, -2.5), -STEP)
        if wired.wired and over:
            depths.append(self.wire_back(-PIN, -2.1))
        self.output([0.0, *heights, *depths])

    def supplies(self) -> None:
        supply = self.stage.supply
        if not supply.pins:
            return
        for net, level, up in (
            (supply.positive_net, supply.positive, 1.0),
            (supply.negative_net, supply.negative, -1.0),
        ):
            x = 0.72
            self.line((x, up * 0.83), (x, up * 1.35))
            if net == GROUND and up < 0:
                self.sheet.add(self.symbols.Ground().at((x, -1.35)))
                continue
            name = "" if net == GROUND else short(net)
            known = si(level, "V") if level is not None else ""
            self.text(f"{name} {known}".strip(), (x + 0.15, up * 1.3))

    def rise(self, raised: float) -> None:
        if raised != PIN:
            self.line((0, PIN), (-0.5, PIN), (-0.5, raised))

    def chain(self, nodes: Sequence[Node], source: str, y: float) -> list[tuple[float, Node]]:
        """Draw a chain leftwards at height `y`; return where its feedback lines start."""
        x = 0.0 if y in (PIN, -PIN) else -0.5
        starts: list[tuple[float, Node]] = []
        start = x
        if len(nodes) == 1 and not (nodes[0].shunts or nodes[0].feedback or nodes[0].onward):
            self.end(nodes[0].net, x, y)
            return starts
        for node in nodes:
            if node.feedback:
                x -= LEAD
                starts.append((x, node))
                self.dot((x, y))
            for shunt in node.shunts:
                x -= _room_right(shunt)
                self.shunt(shunt, (x, y))
                self.dot((x, y))
            self.line((start, y), (x, y))
            if node.onward is None:
                break
            begin = x - 0.3
            end = begin - ELEMENT * len(node.onward.elements)
            self.line((x, y), (begin, y))
            self.branch(node.onward, (begin, y), (end, y))
            x = start = end
        last = nodes[-1]
        if last.onward is not None or source:
            self.end(source or last.net, x, y)
        elif not last.shunts:
            self.end(last.net, x, y)
        return starts

    def end(self, net: str, x: float, y: float) -> None:
        """Draw where a chain comes from: ground, a named net, or nothing for the output."""
        if net == self.stage.output.net:
            return
        left = x - 0.5
        self.line((x, y), (left, y))
        if net == GROUND:
            self.line((left, y), (left, y - 0.3))
            self.sheet.add(self.symbols.Ground().at((left, y - 0.3)))
            return
        self.dot((left, y), open_=True)
        self.text(short(net), (left - 0.2, y), "end")

    def feedback(
        self, starts: list[tuple[float, Node]], base: float, first: float, step: float
    ) -> list[float]:
        """Draw feedback lines over or under a chain of height `base`, each further out."""
        heights: list[float] = []
        y = first
        for x, node in starts:
            at = base
            for branch in node.feedback:
                self.line((x, at), (x, y))
                self.branch(branch, (x, y), (OUT, y))
                heights.append(y)
                at, y = y, y + step
        return heights

    def wire_back(self, y: float, height: float) -> float:
        """Draw the wire of a follower."""
        x = -LEAD - (0.5 if y not in (PIN, -PIN) else 0.0)
        self.line((0 if y in (PIN, -PIN) else -0.5, y), (x, y), (x, height), (OUT, height))
        return height

    def output(self, heights: Sequence[float]) -> None:
        low, high = min(heights), max(heights)
        self.line((TIP, 0), (OUT, 0))
        if low < high:
            self.line((OUT, low), (OUT, high))
            self.dot((OUT, 0))
        x, step = OUT, 0.0
        for load in self.wired.loads:
            begin, x = x, x + max(step, _half_end(load) + 0.3, 1.2)
            self.line((begin, 0), (x, 0))
            self.dot((x, 0))
            self.shunt(load, (x, 0))
            step = _room_right(load)
        self.line((x, 0), (x + 0.9, 0))
        self.dot((x + 0.9, 0), open_=True)
        self.text(short(self.stage.output.net), (x + 1.1, 0))

    # ---------------------------------------------------------------- result

    def picture(self) -> ET.Element:
        source = ET.fromstring(self.raw)  # schemdraw wrote it a moment ago
        labels = [_Label(*text) for text in self.texts]
        x, y, width, height = (float(part) for part in source.get("viewBox", "").split())
        left = min([x, *(label.left for label in labels)]) - MARGIN
        right = max([x + width, *(label.right for label in labels)]) + MARGIN
        top = min([y, *(label.y - FONT for label in labels)]) - MARGIN
        bottom = max([y + height, *(label.y + FONT for label in labels)]) + MARGIN
        made = svg.picture(right - left, bottom - top, self.title(), "drawing", left, top)
        for child in source:
            _copy(child, made)
        made.extend(label.node() for label in labels)
        return made

    def title(self) -> str:
        stage = self.stage
        return (
            f"Drawing of {stage.schematic}, {stage.topology}; its connections are listed below it"
        )


class _Label:
    """A text of the drawing, in points; `left` and `right` as wide as its letters may be."""

    def __init__(self, text: str, at: Point, anchor: Anchor) -> None:
        self.text, self.anchor = text, anchor
        self.x, self.y = at[0] * POINTS_A_UNIT, -at[1] * POINTS_A_UNIT
        width = LETTER * len(text)
        self.left = self.x - width * {"start": 0.0, "middle": 0.5, "end": 1.0}[anchor]
        self.right = self.left + width

    def node(self) -> ET.Element:
        return svg.node(
            "text",
            self.text,
            x=self.x,
            y=self.y + FONT * 0.35,  # the letters' middle stands on the height asked for
            font_size=FONT,
            text_anchor=self.anchor,
            fill="currentColor",
        )


def _copy(source: ET.Element, parent: ET.Element) -> None:
    """Copy what a drawing needs and nothing else; styles become plain attributes."""
    tag = source.tag.rsplit("}", 1)[-1]
    if tag not in _TAGS:
        return
    made = ET.SubElement(parent, tag)
    for name in _PLACES:
        if name in source.attrib:
            made.set(name, source.attrib[name])
    for name, value in _style(source.get("style", "")):
        made.set(name, value)
    for child in source:
        _copy(child, made)


def _style(text: str) -> Iterator[tuple[str, str]]:
    for part in text.split(";"):
        name, _, value = part.partition(":")
        if name in _STYLES:
            yield name, "currentColor" if value.lower() == "currentcolor" else value


def _depth(nodes: Sequence[Node]) -> float:
    """Return how far down the longest shunt of a chain reaches, with what it ends on."""
    longest = max((len(s.elements) for node in nodes for s in node.shunts), default=0)
    return longest * ELEMENT * 0.8 + 0.6 if longest else 0.0


def _room_right(branch: Branch) -> float:
    """Return what a vertical branch's names and values take to its right."""
    texts = [t for e in branch.elements for t in (e.designator, value_of(e))]
    longest = max((len(short(text)) for text in texts), default=0)
    return max(GAP + longest * LETTER / POINTS_A_UNIT, _half_end(branch) + 0.3)


def _half_end(branch: Branch) -> float:
    """Return half the width of the net's name under a vertical branch."""
    return 0.0 if branch.end == GROUND else len(short(branch.end)) * LETTER / POINTS_A_UNIT / 2


def _between(start: Point, end: Point, share: float) -> Point:
    return (start[0] + (end[0] - start[0]) * share, start[1] + (end[1] - start[1]) * share)
