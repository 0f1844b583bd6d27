"""The netlists every report format is tried on, by name; all invented, of one gauge station."""

import datetime as dt
import shutil
from pathlib import Path

from tests.gauge import DECK

FIXTURES = Path(__file__).parents[2] / "fixtures"
DAY = dt.date(2027, 1, 31)

GAUGE = DECK.replace("{feedback}", "100k")

PARTLY = """gauge output stage, some of it lost
.include lost.inc
VIN in 0 SIN(0 0.5 1k)
R1 in n 10k
R2 n out 100k
R3 out
RL out 0 600
XU1 0 n vp vn out TL072
XU2 0 m vp vn aux NOBODYKNOWS77
XU3 0 k far vn end TL072
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
.end
"""

WAIVER = """[[waivers]]
rule = "drive-current"
designator = "XU1"
reason = "line test only, 10 ms"
by = "hardware lead"
until = 2027-06-30
"""

HOSTILE = """<img src=x onerror=alert(1)> \x1b[31m [bold red]title[/] \u202e =1+1
VIN {i} 0 SIN(0 0.5 1k)
R1 {i} {n} 10k
R2 {n} {o} 100k
RL {o} 0 100
{u} 0 {n} {p} vn {o} TL072
X{i}2 0 {n} {p} vn {o} <script>NOBODY
V1 {p} 0 12
VN vn 0 -12
RX1 one\x1b[2J
R{o} {i}
* railguard: waive decoupling-absent {u} "![x](http://gauge.example) @all \x1b]0;t\x07"
* railguard: use {u} comparator
* railguard: net {o} [link](javascript:x)
.include "![x](y)|=cmd {o}.inc"
.end
"""

NAMES = (
    ("![x]", "**n**_", "http://gauge.example/x", "-1", "X[U1]"),
    ("<b>in", "@all`x`|#1", "o\u202eut", "+1+cmd|", "XU<b>1"),
    ("a\x07b", "\u009bb", "c\x1b[31md", "www.gauge.example", "XU1\u2028"),
    ("@here", "]]>&amp;<!--", "[red]out[/]", "@SUM", "X#12"),
    ("|pipe|", "~~s~~", "-cmd", ":warning:", "X:U1:"),
)
"""Input, node, output, rail and amplifier, as no one means them; one netlist each."""

HOSTILE_FILE = "=a'b [x](y) @all <i>#1\x1b[31m\u202e{}.cir"

MANY = 200


def paths(name: str, folder: Path) -> list[Path]:
    """Lay a design into a folder and return its netlists."""
    if name in ("sound", "faulty"):
        source = (
            FIXTURES
            / {
                "sound": "station/station.cir",
                "faulty": "faults/headroom-output.cir",
            }[name]
        )
        place = folder / source.name
        shutil.copy(source, place)
        stated = source.with_name("railguard.toml")
        if stated.exists():
            shutil.copy(stated, folder)
        return [place]
    if name == "many":
        return [_gauge(folder, number) for number in range(MANY)]
    if name == "none":
        return []
    if name == "hostile":
        return [_hostile(folder, number) for number in range(len(NAMES))]
    place = folder / "gauge.cir"
    if name == "waived":
        (folder / "railguard.toml").write_text(WAIVER, encoding="utf-8")
    if name != "missing":
        place.write_text(_TEXTS[name], encoding="utf-8", newline="")
    return [place]


_TEXTS = {
    "partly": PARTLY,
    "empty": "",
    "waived": GAUGE.format(peak=0.5, load=600),
}


def _hostile(folder: Path, number: int) -> Path:
    """Write one of the netlists whose names would be obeyed if nothing escaped them."""
    place = folder / HOSTILE_FILE.format(number)
    text = HOSTILE.format(**dict(zip("inopu", NAMES[number], strict=True)))
    place.write_text(text, encoding="utf-8", newline="")
    return place


def _gauge(folder: Path, number: int) -> Path:
    """Write one of many gauges: every third drives a load it cannot."""
    place = folder / f"river {number // 20}" / f"gauge_{number:03}.cir"
    place.parent.mkdir(exist_ok=True)
    load = 600 if number % 3 == 0 else 10_000
    place.write_text(GAUGE.format(peak=0.3 + number / 1000, load=load))
    return place


KINDS = ("sound", "faulty", "partly", "empty", "missing", "waived", "hostile", "many", "none")
