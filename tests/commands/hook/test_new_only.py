"""`--new-only`: what the committed version already had lets pass, what is new or worse stops."""

import msgspec
import pytest

from railguard.commands.hook.compare import only_new
from railguard.reviewing import review
from railguard.rules.finding import Finding, WaiverNote
from tests import gauge
from tests.gauge import CLIPPED, SOUND


def known(repository, text=CLIPPED, path="gauge.cir"):
    """Commit a netlist as it is."""
    repository.add(path, text)
    repository.keep()


def test_a_fault_from_before_lets_pass(repository):
    """Its netlist changed elsewhere; it is said that something was not counted."""
    known(repository)
    repository.add("gauge.cir", CLIPPED.replace("CP vp 0 100n", "CP vp 0 220n"))
    assert not repository.check()[0]
    passed, told = repository.check("--new-only")
    assert passed
    assert "1 finding of the committed version not counted" in told


def test_a_fault_that_got_worse_stops(repository):
    """The same finding with less margin."""
    known(repository)
    repository.add("gauge.cir", gauge.deck(feedback="560k"))
    passed, told = repository.check("--new-only")
    assert not passed
    assert "headroom-output" in told


def test_a_fault_that_got_better_lets_pass(repository):
    """Still a fault, and less of one."""
    known(repository)
    repository.add("gauge.cir", gauge.deck(feedback="330k"))
    assert repository.check("--new-only")[0]


def test_a_new_fault_beside_an_old_one_is_shown_alone(repository):
    """The one from before is not repeated."""
    known(repository)
    repository.add("gauge.cir", CLIPPED.replace("CN vn 0 100n\n", ""))
    passed, told = repository.check("--new-only")
    assert not passed
    assert "decoupling-absent" in told
    assert "headroom-output" not in told


def test_first_commit_has_nothing_to_compare_with(repository):
    """All is new."""
    repository.add("gauge.cir", CLIPPED)
    assert not repository.check("--new-only")[0]


def test_a_renamed_netlist_keeps_its_past(repository):
    """Its findings are the same under the new name."""
    known(repository)
    repository.git("mv", "gauge.cir", "boards.cir")
    assert not repository.check()[0]
    assert repository.check("--new-only")[0]


def test_a_waiver_taken_out_brings_its_finding_back(repository):
    """What was accepted is not accepted any more: that is new."""
    repository.add("railguard.toml", '[[waivers]]\nrule = "headroom-output"\nreason = "x"\n')
    known(repository)
    repository.add("railguard.toml", "")
    passed, told = repository.check("--new-only")
    assert not passed
    assert "headroom-output" in told


def test_a_committed_version_that_cannot_be_reviewed(repository):
    """Then all counts as new, and it is said why."""
    repository.add("railguard.toml", "[revieu]\n")
    known(repository)
    repository.add("railguard.toml", "")
    passed, told = repository.check("--new-only")
    assert not passed
    assert "The committed version cannot be reviewed" in told


def test_an_include_that_is_as_it_was_in_the_commit(repository):
    """The committed version is reviewed with its own includes and settings."""
    known(repository, SOUND.replace("RL out 0 10k\n", ".include load.inc\n"))
    repository.add("load.inc", "RL out 0 20\n")
    repository.keep()
    repository.add("load.inc", "RL out 0 22\n")
    repository.write("load.inc", "RL out 0 10k\n")
    assert not repository.check()[0]
    assert repository.check("--new-only")[0]


def test_a_merge_has_more_than_one_past(repository):
    """A fault of either side is none of the merge."""
    known(repository, SOUND)
    repository.git("checkout", "-q", "-b", "side")
    known(repository, CLIPPED)
    repository.git("checkout", "-q", "main")
    known(repository, SOUND.replace("CP vp 0 100n", "CP vp 0 220n"))
    repository.git("merge", "-q", "--no-commit", "--no-verify", "side")
    assert not repository.check()[0]
    assert repository.check("--new-only")[0]


def test_installed_with_the_hook(repository):
    """The option is the hook's."""
    known(repository)
    repository.hook("install", "--new-only")
    repository.add("gauge.cir", CLIPPED.replace("CP vp 0 100n", "CP vp 0 220n"))
    made, told = repository.commit()
    assert made
    assert "not counted" in told


# ------------------------------------------------------------------ the comparison itself


@pytest.fixture(scope="module")
def plain():
    """A review to put findings into."""
    (design,) = review(SOUND).designs
    return msgspec.structs.replace(design, findings=(), not_checked=())


def finding(severity="major", margin=-1.0, name="XU1", **more):
    """Make a finding."""
    fields = {"rule": "drive-current", "family": "drive", "unit": "A", "message": "m", **more}
    return Finding(severity=severity, margin=margin, designators=(name,), **fields)


def left(plain, new, *old):
    """Return what is left of some findings beside those of one or several committed versions."""
    sides = [msgspec.structs.replace(plain, findings=tuple(side)) for side in old]
    return only_new(msgspec.structs.replace(plain, findings=tuple(new)), sides)


@pytest.mark.parametrize(
    ("new", "old", "stays"),
    [
        (finding(), finding(), False),
        (finding(margin=-1.0 - 1e-9), finding(), False),
        (finding(margin=-1.01), finding(), True),
        (finding(margin=-0.99), finding(), False),
        (finding("critical", -0.5), finding(), True),
        (finding("minor", -2.0), finding(), False),
        (finding(margin=None), finding(), False),
        (finding(), finding(margin=None), False),
        (finding(name="XU2"), finding(), True),
        (finding(rule="drive-power"), finding(), True),
        (finding(nets=("out",)), finding(), True),
        (finding(unit="W", margin=-9.0), finding(), False),
        (finding(), finding(waiver=WaiverNote("bench only")), True),
    ],
)
def test_what_is_new_or_worse(plain, new, old, stays):
    """By severity first, then by margin of the same unit."""
    assert left(plain, [new], [old]).findings == ((new,) if stays else ())


def test_several_findings_of_one_name(plain):
    """Worst is compared with worst; one more than before is new."""
    low, high = finding(margin=-1.0), finding(margin=-3.0)
    assert left(plain, [high, low], [low, high]).findings == ()
    assert left(plain, [high, low], [high]).findings == (low,)


def test_what_followed_from_another_finding_was_there(plain):
    """Its cause is gone, and it stands alone now: it is not new."""
    inner = finding()
    outer = finding(name="V1", consequences=(inner,))
    assert left(plain, [inner], [outer]).findings == ()


def test_one_side_of_a_merge_is_enough(plain):
    """Nothing was said by one side, all by the other."""
    assert left(plain, [finding()], [], [finding()]).findings == ()
    assert left(plain, [finding()], [], []).findings == (finding(),)


def test_the_verdict_is_made_anew(plain):
    """A hold of what was there before is none."""
    assert left(plain, [finding()], [finding()]).verdict != "hold"
    assert left(plain, [finding()], []).verdict == "hold"


def test_waived_findings_stay_listed(plain):
    """They hold nothing, and a report may show them."""
    waived = finding(waiver=WaiverNote("bench only"))
    assert left(plain, [waived], [waived]).findings == (waived,)
