"""The one-way order of imports, read from every file of the package.

Each room may use what stands left of it. Packages that cost start-up time are imported in the
function that needs them.
"""

import ast
from pathlib import Path

import pytest

import railguard

ROOT = Path(railguard.__file__).parent

ORDER = (
    ("location", "words", "errors", "notices", "units", "threads"),
    ("settings", "devices", "deck"),
    ("circuit",),
    ("analysis",),
    ("engine",),
    ("rules",),
    ("reviewing",),
    ("simulated", "redline"),
    ("report",),
    ("audit",),
    ("commands", "plugins"),
)
"""Left to right; rooms of one step do not know each other."""

RANK = {room: step for step, rooms in enumerate(ORDER) for room in rooms}

SHARED = ORDER[0]
"""Single modules of the first step, each of which may use those before it."""

ENGINE_USERS = ("engine", "simulated", "commands")
"""`simulated` confirms with it, and one command measures a device."""

HEAVY = ("scipy", "PySpice", "jinja2", "schemdraw", "distributed", "dask", "fsspec", "eseries")
"""Import time: scipy's sparse solver 330 ms, PySpice 125, jinja2 60, eseries 45 ms."""

ONLY_PLUGINS = ("pytest", "PySpice")
"""Hosts: a module of `plugins` named after one is loaded by it, so it is there already."""

FILES = sorted(ROOT.rglob("*.py"))


def room_of(module):
    """Return the room of a module of the package: `railguard.deck.files` is in `deck`."""
    return module.split(".")[1]


def module_of(path):
    """Return the dotted name of a file."""
    parts = path.relative_to(ROOT.parent).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imports(tree):
    """Yield (module, line, runs at start-up) of every import, those in functions included."""
    inner = {
        id(node)
        for function in ast.walk(tree)
        if isinstance(function, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda)
        or _is_for_types(function)
        for node in ast.walk(function)
    }
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield alias.name, node.lineno, id(node) not in inner
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"line {node.lineno}: relative import"
            names = [alias.name for alias in node.names]
            assert "*" not in names, f"line {node.lineno}: star import"
            base = node.module or ""
            if base == "railguard":
                for name in names:
                    yield f"railguard.{name}", node.lineno, id(node) not in inner
            else:
                yield base, node.lineno, id(node) not in inner


def _is_for_types(node):
    """Tell whether a block is read by type checkers only: it costs nothing at start-up."""
    return isinstance(node, ast.If) and getattr(node.test, "id", "") == "TYPE_CHECKING"


def faults_of(module, text):
    """Return what is wrong with the imports of a module, one sentence each."""
    if module in ("railguard", "railguard.__main__"):
        return []
    room = room_of(module)
    faults = []
    for name, line, at_module in imports(ast.parse(text)):
        top = name.split(".")[0]
        host = room == "plugins" and top in ONLY_PLUGINS
        if at_module and top in HEAVY and not host:
            faults.append(f"{module}, line {line}: {top} at module level costs start-up time")
        if top == "pytest" and not host:
            faults.append(f"{module}, line {line}: pytest belongs to its plug-in")
        if top != "railguard":
            continue
        if name == "railguard":
            faults.append(f"{module}, line {line}: the package as a whole")
            continue
        used = room_of(name)
        if used == "__version__":
            continue
        if used not in RANK:
            faults.append(f"{module}, line {line}: {used} is no room")
        elif used != room and not _may_use(room, used):
            faults.append(f"{module}, line {line}: {room} must not use {used}")
    return faults


def _may_use(room, used):
    """Tell whether one room may use another one."""
    if room in SHARED and used in SHARED:
        return SHARED.index(used) < SHARED.index(room)
    if used == "engine" and room not in ENGINE_USERS:
        return False
    return RANK[used] < RANK[room]


def test_every_file_stands_in_a_room():
    """A new folder has to be given its place in the order first."""
    rooms = {module_of(path).split(".")[1] for path in FILES if path.parent != ROOT}
    modules = {path.stem for path in FILES if path.parent == ROOT}
    assert rooms | modules - {"__init__", "__main__"} == set(RANK)


@pytest.mark.parametrize("path", FILES, ids=module_of)
def test_imports_run_one_way(path):
    """No room uses one to its right, and none loads a heavy package before it is needed."""
    assert faults_of(module_of(path), path.read_text(encoding="utf-8")) == []


@pytest.mark.parametrize(
    ("module", "text", "fault"),
    [
        ("railguard.deck.files", "from railguard.circuit.model import Circuit", "must not use"),
        ("railguard.deck.files", "import railguard.settings.model", "must not use settings"),
        ("railguard.rules.drive", "from railguard.engine import ngspice", "must not use engine"),
        ("railguard.report.html", "from railguard import commands", "must not use commands"),
        ("railguard.plugins.host", "from railguard.commands.main import x", "must not use"),
        ("railguard.location", "from railguard.errors import UsageError", "must not use errors"),
        ("railguard.analysis.solve", "import scipy.sparse", "start-up time"),
        ("railguard.units", "if True:\n    from eseries import E24", "start-up time"),
        ("railguard.reviewing", "import pytest", "belongs to its plug-in"),
        ("railguard.reviewing", "from railguard.parts import x", "is no room"),
        (
            "railguard.circuit.model",
            "def f():\n    from railguard.rules import x",
            "must not use rules",
        ),
    ],
)
def test_a_wrong_import_is_found(module, text, fault):
    """The check itself can fail."""
    (found,) = faults_of(module, text)
    assert fault in found


@pytest.mark.parametrize(
    ("module", "text"),
    [
        ("railguard.errors", "from railguard.location import Location"),
        ("railguard.analysis.solve", "def f():\n    import scipy.sparse"),
        ("railguard.plugins.pyspice_front", "import PySpice"),
        ("railguard.plugins.pytest_plugin", "import pytest"),
        ("railguard.report.json", "from railguard import __version__"),
        ("railguard.simulated", "from railguard.engine.ngspice import run"),
    ],
)
def test_a_right_import_is_not(module, text):
    """What stands to the left may be used, and a heavy package in the function that needs it."""
    assert faults_of(module, text) == []
