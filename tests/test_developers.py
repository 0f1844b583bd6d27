"""What DEVELOPERS.md points at is there."""

import importlib.util
import re
from pathlib import Path

ROOT = Path(__file__).parents[1]
TEXT = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
TOPS = ("railguard", "tests", "fixtures", "grammar", ".ci")
FILES = [
    *TOPS,
    *(
        path.relative_to(ROOT).as_posix()
        for top in TOPS
        for path in (ROOT / top).rglob("*")
        if "__pycache__" not in path.parts
    ),
]


def pointed_at():
    """Return the paths the text names: with a slash in them, or ending as sources do."""
    prose = re.sub(r"```.*?```", "", TEXT, flags=re.DOTALL)
    words = {word for span in re.findall(r"`([^`\n]+)`", prose) for word in span.split()}
    paths = {
        word for word in words if re.fullmatch(r"[a-z_.][\w./-]*(?:/|/\w+|\.(?:py|lark))", word)
    }
    return sorted(path.rstrip("/") for path in paths if not re.search(r"[A-Z]{4}|^/", path))


def test_every_path_is_there():
    """As it is written, or below the package; a module may stand without its ending."""
    ends = [f"/{file}" for file in FILES]
    missing = [
        path
        for path in pointed_at()
        if not any(end.endswith((f"/{path}", f"/{path}.py")) for end in ends)
    ]
    assert missing == []


def test_paths_are_found_at_all():
    """The check reads what it should."""
    assert {"rules/severity.py", "tests/bench", "railguard/devices/data"} <= set(pointed_at())
    assert len(pointed_at()) > 30


def test_every_module_of_the_analysis_is_one():
    """The numbered list names modules."""
    part = TEXT.split("### The analysis, in the order it runs")[1].split("\n## ")[0]
    listed = re.findall(r"^\d+\. (`[a-z_`, \n]+`)", part, re.MULTILINE)
    names = {name for row in listed for name in re.findall(r"[a-z_]+", row)}
    assert len(names) > 15
    assert [n for n in names if importlib.util.find_spec(f"railguard.analysis.{n}") is None] == []
