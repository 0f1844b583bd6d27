"""The terminal's report as a picture: for a README, a slide or a ticket that takes no HTML.

The same lines as on the screen, in 80 columns, as text in an SVG that fetches no font.
"""

import io
from pathlib import Path

from rich.console import Console
from rich.terminal_theme import TerminalTheme

from railguard.report.terminal import print_on
from railguard.reviewing import Review

COLUMNS = 80

_INK, _GROUND = (29, 35, 39), (251, 250, 246)
_CRITICAL, _MAJOR, _MINOR = (148, 25, 90), (122, 74, 0), (27, 90, 134)
_COLOURS = [_INK, _CRITICAL, _INK, _MAJOR, _INK, _CRITICAL, _MINOR, _INK]
"""Black, red, green, yellow, blue, magenta, cyan, white; the report uses three of them."""

_THEME = TerminalTheme(_GROUND, _INK, _COLOURS, _COLOURS)

_PICTURE = """\
<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width} {height}" role="img">
<title>Report of railguard</title>
<style>
.{unique_id}-matrix {{ font-family: "DejaVu Sans Mono", Menlo, Consolas, monospace; \
font-size: {char_height}px; }}
{styles}
</style>
<defs>{lines}</defs>
<rect width="100%" height="100%" fill="#fbfaf6"/>
<g transform="translate(9, 24)">{backgrounds}<g class="{unique_id}-matrix">
{matrix}
</g></g>
</svg>
"""


def document(review: Review, root: Path | None = None) -> bytes:
    """Return the report as an SVG picture.

    root  the run's root; the picture names no fingerprints, so it is not used
    """
    del root
    console = Console(
        file=io.StringIO(),
        record=True,
        width=COLUMNS,
        force_terminal=True,
        color_system="truecolor",
        no_color=False,
        highlight=False,
        markup=False,
        emoji=False,
    )
    print_on(console, review)
    picture = console.export_svg(
        title="", theme=_THEME, code_format=_PICTURE, unique_id="railguard"
    )
    return picture.encode("utf-8", "replace")
