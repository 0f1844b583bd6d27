"""pytest with `--railguard`: each case is a pytest run of its own."""

import importlib.metadata
import tomllib
from pathlib import Path

import pytest

from railguard import reviewing
from railguard.report import terminal
from tests.gauge import CLIPPED, SOUND

pytest_plugins = ["pytester"]

ROOT = Path(__file__).parents[2]
LOADED = (reviewing, terminal)
"""Runs in this process put the loaded modules back afterwards, and numpy is loaded only once."""

HEAVY = ("msgspec", "numpy", "lark", "click", "rich", "railguard.reviewing")


@pytest.fixture
def run(pytester, monkeypatch):
    """Run pytest in a folder of its own, with the plug-in loaded as an installation does it."""
    monkeypatch.setenv("PYTHONPATH", str(ROOT))
    points = importlib.metadata.entry_points(group="pytest11")
    named = [] if "railguard" in points.names else ["-p", "railguard.plugins.pytest_plugin"]

    def with_plugin(*arguments, apart=False):
        start = pytester.runpytest_subprocess if apart else pytester.runpytest_inprocess
        return start(*named, *arguments)

    return with_plugin


@pytest.fixture
def decks(pytester):
    """Two sound netlists and a clipped one, in two folders."""
    boards = pytester.mkdir("boards")
    (boards / "gauge.cir").write_text(SOUND)
    (boards / "clipped.cir").write_text(CLIPPED)
    (pytester.path / "level.net").write_text(SOUND)
    return pytester.path


def test_the_plug_in_is_an_entry_point():
    """That is how pytest finds it in an installation."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    name = project["entry-points"]["pytest11"]["railguard"]
    assert (ROOT / f"{name.replace('.', '/')}.py").is_file()


def test_off_unless_asked_for(run, decks):
    """Netlists are no tests of a run that did not ask for them."""
    run().assert_outcomes()
    assert "clipped" not in run("--collect-only").stdout.str()


def test_a_run_that_did_not_ask_imports_nothing(run, pytester):
    """The plug-in is loaded in every run of its user, and costs nothing in it."""
    pytester.makepyfile(
        f"import sys\ndef test_it():\n    assert not [m for m in {HEAVY!r} if m in sys.modules]\n"
    )
    run(apart=True).assert_outcomes(passed=1)


def test_each_netlist_is_an_item(run, decks):
    """Collected by their names, beside the tests in Python."""
    found = run("--railguard", "--collect-only", "-q").stdout
    found.fnmatch_lines(["boards/clipped.cir::review", "boards/gauge.cir::review"])
    found.fnmatch_lines(["level.net::review"])
    run("--railguard").assert_outcomes(passed=2, failed=1)


def test_a_failure_reads_as_the_report_does(run, decks):
    """Rule, numbers and remedy; no traceback, nothing that does not hold."""
    told = run("--railguard").stdout
    told.fnmatch_lines(["*railguard: clipped.cir*", "boards/clipped.cir", "U1*TL072*"])
    told.fnmatch_lines(["  critical  headroom-output, line 6", "*Remedy*"])
    told.no_fnmatch_line("*Traceback*")
    told.no_fnmatch_line("*runtest*")
    told.no_fnmatch_line("*How it was read*")


def test_selected_by_name_and_by_mark(run, decks, pytester):
    """`-k` and `-m` work as for any test."""
    pytester.makepyfile("def test_other(): pass")
    run("--railguard", "-k", "gauge or other").assert_outcomes(passed=2, deselected=2)
    run("--railguard", "-m", "railguard").assert_outcomes(passed=2, failed=1, deselected=1)
    run("--railguard", "-m", "not railguard").assert_outcomes(passed=1, deselected=3)
    run("--railguard", "--strict-markers").assert_outcomes(passed=3, failed=1)


def test_stops_at_the_first_failure(run, decks):
    """`-x` after the clipped one, which comes first."""
    result = run("--railguard", "-x")
    result.assert_outcomes(failed=1)
    result.stdout.fnmatch_lines(["*stopping after 1 failures*"])


def test_in_several_processes(run, decks):
    """The same items and the same outcome under xdist."""
    pytest.importorskip("xdist")
    result = run("--railguard", "-n", "2", apart=True)
    result.assert_outcomes(passed=2, failed=1)
    result.stdout.fnmatch_lines(["*headroom-output*"])


def test_settings_beside_the_netlist_are_obeyed(run, decks):
    """A waiver lets it pass; settings that cannot be obeyed fail with their line."""
    toml = decks / "boards" / "railguard.toml"
    toml.write_text('[[waivers]]\nrule = "headroom-output"\nreason = "bench only"\n')
    run("--railguard").assert_outcomes(passed=3)
    toml.write_text("[revieu]\n")
    result = run("--railguard", "boards")
    result.assert_outcomes(failed=2)
    result.stdout.fnmatch_lines(["*railguard.toml, line 1*"])
    result.stdout.no_fnmatch_line("*Traceback*")


def test_the_hold_level_may_be_moved(run, pytester):
    """An option that stands over the settings."""
    loose = SOUND.replace(".end", "R9 out x 1k\n.end")
    pytester.makefile(".cir", gauge=loose)
    run("--railguard").assert_outcomes(passed=1)
    run("--railguard", "--railguard-hold-at", "remark").assert_outcomes(failed=1)
    assert run("--railguard", "--railguard-hold-at", "high").ret == pytest.ExitCode.USAGE_ERROR


def test_which_names_are_netlists_can_be_stated(run, decks, pytester):
    """In the settings of pytest."""
    pytester.makeini("[pytest]\nrailguard_netlists = *.netlist gauge*.CIR\n")
    (decks / "a.netlist").write_text(CLIPPED)
    run("--railguard").assert_outcomes(passed=1, failed=1)


def test_what_cannot_be_judged_is_skipped_with_its_reason(run, pytester):
    """Never passed: a netlist without op-amps, and a file of another format."""
    pytester.makefile(".cir", divider="divider\nV1 a 0 5\nR1 a b 1k\nR2 b 0 1k\n.end\n")
    pytester.makefile(".net", board='(export (version "E"))\n')
    result = run("--railguard", "-rs")
    result.assert_outcomes(skipped=2)
    result.stdout.fnmatch_lines(["*no op-amp was recognised*"])
    result.stdout.fnmatch_lines(["*board.net is a board netlist in another format*"])


def test_what_stayed_open_can_be_shown(run, decks):
    """`-rP` prints the verdict of those that passed."""
    run("--railguard", "-rP").stdout.fnmatch_lines(["Verdict: *judged*not checked*"])


def test_a_fault_of_the_program_is_shown_as_one(run, decks, monkeypatch):
    """With its traceback, and not as a fault of the netlist."""
    monkeypatch.setattr(reviewing, "review", lambda *_, **__: 1 / 0)
    result = run("--railguard", "-k", "gauge")
    result.assert_outcomes(failed=1, deselected=2)
    result.stdout.fnmatch_lines(["*ZeroDivisionError*"])
