"""Rules that other packages bring by their entry points."""

import textwrap

import pytest

from railguard.rules import registry
from railguard.rules.third_party import installed
from tests.rules.stages import design, stage

RULE = """
from railguard.rules.compose import stage_finding
from railguard.rules.protocol import Rule


def judge(stage, limits, design):
    yield stage_finding("drive-house", stage, "minor", "House rule.")


OWN = Rule(name={name!r}, family="drive", looks_at="stage", judges="x.", reason="x.", source="x",
           judge={judge})
BOTH = (OWN,)
"""


@pytest.fixture
def bring(tmp_path, monkeypatch):
    """Install a package with one entry point beside the others."""

    def install(body, target="OWN", module="house_rules"):
        (tmp_path / f"{module}.py").write_text(textwrap.dedent(body))
        info = tmp_path / f"{module}-1.0.dist-info"
        info.mkdir()
        (info / "METADATA").write_text(f"Metadata-Version: 2.1\nName: {module}\nVersion: 1.0\n")
        (info / "entry_points.txt").write_text(f"[railguard.rules]\nhouse = {module}:{target}\n")
        monkeypatch.syspath_prepend(str(tmp_path))

    return install


@pytest.mark.parametrize("target", ["OWN", "BOTH"])
def test_a_rule_of_another_package_runs(bring, target):
    """One rule, or a tuple of them, is found and judges."""
    module = f"house_{target.lower()}"
    bring(RULE.format(name="drive-house", judge="judge"), target, module)
    found = installed()
    assert [r.name for r in found.rules] == ["drive-house"]
    result = registry.judge(design(stage()), found.rules)
    assert "House rule." in [f.message for f in result.findings]


@pytest.mark.parametrize(
    ("body", "target", "words"),
    [
        ("raise OSError('no licence')", "OWN", "OSError: no licence"),
        ("OWN = 3", "OWN", "is no rule"),
        ("OWN = 3", "GONE", "could not be loaded"),
        (RULE.format(name="headroom-output", judge="judge"), "OWN", "headroom-output already"),
        (RULE.format(name="house", judge="judge"), "OWN", "does not begin with its family, drive"),
        (RULE.format(name="drive-house", judge="None"), "OWN", "is no function"),
    ],
)
def test_what_cannot_be_used_is_a_remark(bring, request, body, target, words):
    """A broken plug-in is told and left out."""
    bring(body, target, f"broken_{abs(hash(request.node.name))}")
    found = installed()
    assert found.rules == ()
    (remark,) = found.remarks
    assert words in remark.message


def test_without_plug_ins_there_is_nothing_to_tell():
    """A plain installation brings no rules and no remarks."""
    assert installed().rules == ()
    assert installed().remarks == ()
