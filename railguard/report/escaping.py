"""Text from a netlist made harmless in each format of a report: nothing in it is obeyed.

Every function first writes hidden and steering characters out (`visible`), so that no result holds
a line break, a control character or a change of writing direction.
"""

import re

from railguard.report.visible import visible

_FORMULA = ("=", "+", "-", "@", "\uff1d", "\uff0b", "\uff0d", "\uff20")
"""First characters a spreadsheet takes for a formula; the wide forms count as the plain ones."""

_MARKDOWN = re.compile(r"[\\`*_{}\[\]|~$^]")
_ENTITIES = str.maketrans({"&": "&amp;", "<": "&lt;", ">": "&gt;"})
_REFERENCES = re.compile(
    r"(?<=[@#!])(?=\w)"  # a person or group, an issue, a merge request
    r"|(?<=:)(?=//|[\w+-]+:)"  # an address; a picture by its name between two colons
    r"|(?<=\bwww)(?=\.)"
    r"|(?<=\bGH)(?=-\d)"
    r"|(?<=\bmailto)(?=:)",
    re.IGNORECASE,
)
"""Places at which a forge would find a name, an address or a number of its own to link to."""

_APART = "&#8288;"
"""A word joiner: it takes no room, and what it parts is linked to nothing."""

_LINK = re.compile(r"\](?=\()")


def csv_cell(text: str) -> str:
    """Return a text as one field of a CSV file that no spreadsheet takes for a formula.

    The `csv` module quotes it; a text that begins like a formula gets an apostrophe before it.
    """
    shown = visible(text)
    return f"'{shown}" if shown.lstrip().startswith(_FORMULA) else shown


def markdown(text: str) -> str:
    """Return a text for Markdown, outside of code and never first on a line.

    No emphasis, code, table, link, picture, HTML, mention, reference or mathematics comes of it
    (CommonMark 0.31 with the extensions of the usual forges).
    """
    safe = _MARKDOWN.sub(r"\\\g<0>", visible(text)).translate(_ENTITIES)
    return _REFERENCES.sub(_APART, safe)


def sarif(text: str) -> str:
    """Return a text for a SARIF message: braces doubled, and no link comes of it.

    Source  SARIF 2.1.0, 3.11.5 (placeholders) and 3.11.6 (embedded links)
    """
    return _LINK.sub("] ", visible(text).replace("{", "{{").replace("}", "}}"))


def xml(text: str) -> str:
    """Return a text of characters that XML 1.0 has; the writer escapes its marks."""
    return visible(text)
