"""Rules that other packages bring by their entry points."""

import importlib.metadata
import sys
import textwrap
import zipfile

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


def test_the_report_names_what_came_with_which_package(bring):
    """One remark for all that was taken."""
    bring(RULE.format(name="drive-house", judge="judge"), module="house_named")
    (remark,) = installed().remarks
    assert remark.message == "Rules of other packages: drive-house (house_named 1.0)."


def made(**fields):
    """Write a module whose rule has other fields than usual."""
    given = {
        "name": "'drive-house'",
        "family": "'drive'",
        "looks_at": "'stage'",
        "judges": "'x.'",
        "reason": "'x.'",
        "source": "'x'",
        "judge": "print",
        **fields,
    }
    arguments = ", ".join(f"{name}={value}" for name, value in given.items())
    return (
        "from railguard.rules.protocol import Limit, Rule\n"
        "def limit(name='share', default=0.1):\n"
        "    return Limit(name, default, '', 'x', 'x')\n"
        f"OWN = Rule({arguments})\n"
    )


@pytest.mark.parametrize(
    ("body", "target", "words"),
    [
        ("raise OSError('no licence')", "OWN", "OSError: no licence"),
        ("import sys; sys.exit(0)", "OWN", "SystemExit"),
        ("OWN = 3", "OWN", "is no rule"),
        ("OWN = 3", "GONE", "could not be loaded"),
        (made(name="'headroom-output'", family="'headroom'"), "OWN", "headroom-output already"),
        (made(name="'house-drive'"), "OWN", "does not begin with its family, drive"),
        (made(name="'Drive house'"), "OWN", "'Drive house' is no name"),
        (made(name="7"), "OWN", "7 is no name"),
        (made(family="'house'"), "OWN", "'house', is none"),
        (made(looks_at="'net'"), "OWN", "looks at 'net', not at one of stage, rail"),
        (made(judge="None"), "OWN", "is no function"),
        (made(reason="' '"), "OWN", "no text for its reason"),
        (made(source="None"), "OWN", "no text for its source"),
        (made(limits="[limit()]"), "OWN", "no tuple of limits"),
        (made(limits="(0.1,)"), "OWN", "no tuple of limits"),
        (made(limits="(limit(), limit())"), "OWN", "two limits share"),
        (made(limits="(limit(default='1'),)"), "OWN", "default of share of drive-house"),
        (made(limits="(limit(default=float('nan')),)"), "OWN", "is no number"),
    ],
)
def test_what_cannot_be_used_is_a_remark(bring, request, body, target, words):
    """A broken plug-in is told by its name and left out."""
    bring(body, target, f"broken_{abs(hash(request.node.name))}")
    found = installed()
    assert found.rules == ()
    (remark,) = found.remarks
    assert words in remark.message
    assert "house" in remark.message


def test_a_broken_plug_in_leaves_the_others_alone(bring):
    """The rest runs."""
    bring("raise OSError('no licence')", module="broken_alone")
    bring(RULE.format(name="drive-house", judge="judge"), module="house_beside")
    found = installed()
    assert [r.name for r in found.rules] == ["drive-house"]
    assert len(found.remarks) == 2


FINDING = "Finding(rule='drive-house', family='drive', severity={}, message={})"


@pytest.mark.parametrize(
    ("body", "words"),
    [
        ("1 / 0", "ZeroDivisionError"),
        ("raise SystemExit(0)", "SystemExit"),
        ("return 3", "TypeError"),
        ("yield 'all is well'", "yielded str, which is no finding"),
        ("yield " + FINDING.format("'high'", "'x'"), "severity"),
        ("yield " + FINDING.format("'minor'", "5"), "message"),
        ("yield " + FINDING.format("'minor'", "'x'").replace("drive-house", "x"), 'of "x"'),
        ("yield NotChecked('XU1', 'drive-house', None, '')", "why"),
    ],
)
def test_a_rule_that_fails_leaves_its_subject_open(bring, request, body, words):
    """Whatever a stranger's rule does, the subject is listed, and the other rules have run."""
    module = f"failing_{abs(hash(request.node.name))}"
    head = "from railguard.rules.finding import Finding\nfrom railguard.notices import NotChecked\n"
    judge = f"def judge(stage, limits, design):\n    {body}\n"
    bring(head + judge + made(judge="judge"), module=module)
    result = registry.judge(design(stage()), installed().rules)
    (note,) = [n for n in result.not_checked if n.rule == "drive-house"]
    assert note.subject == stage().designator
    assert words in note.why
    assert "headroom-output" in result.rules


def test_a_package_in_an_archive_is_found(tmp_path, monkeypatch):
    """As Python finds it: by a search through the archive."""
    archive = tmp_path / "house.zip"
    with zipfile.ZipFile(archive, "w") as out:
        out.writestr("house_zipped.py", RULE.format(name="drive-house", judge="judge"))
        info = "house_zipped-1.0.dist-info"
        out.writestr(
            f"{info}/METADATA", "Metadata-Version: 2.1\nName: house_zipped\nVersion: 1.0\n"
        )
        out.writestr(f"{info}/entry_points.txt", "[railguard.rules]\nhouse = house_zipped:OWN\n")
    monkeypatch.syspath_prepend(str(archive))
    assert [r.name for r in installed().rules] == ["drive-house"]


def test_a_package_found_by_a_finder_of_its_own(tmp_path, monkeypatch):
    """Whatever brings modules in may bring packages: then Python's search is asked."""

    class Finder:
        """Finds one package, anywhere but on the path."""

        def find_spec(self, name, path=None, target=None):
            return None

        def find_distributions(self, context):
            return [importlib.metadata.PathDistribution(tmp_path)]

    (tmp_path / "METADATA").write_text("Metadata-Version: 2.1\nName: odd\nVersion: 1.0\n")
    (tmp_path / "entry_points.txt").write_text("[railguard.rules]\nodd = nowhere:GONE\n")
    monkeypatch.setattr(sys, "meta_path", [*sys.meta_path, Finder()])
    (remark,) = installed().remarks
    assert "odd (nowhere:GONE) could not be loaded" in remark.message


def test_without_plug_ins_there_is_nothing_to_tell():
    """A plain installation brings no rules and no remarks."""
    assert installed().rules == ()
    assert installed().remarks == ()
