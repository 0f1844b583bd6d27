"""Waivers: what they accept, when they stop, and those that match nothing."""

import datetime as dt
import ntpath
from pathlib import Path

import msgspec
import pytest

from railguard.location import Location
from railguard.rules.finding import Finding, WaiverNote
from railguard.rules.waivers import apply, same_designator, stale
from railguard.settings.model import Settings, Waiver

DAY = dt.date(2027, 1, 31)
PLACE = Location("railguard.toml", 31, 3)
DECK = "lamp/driver.cir"

LAMP = Finding(
    rule="drive-current",
    family="drive",
    severity="critical",
    designators=("XU3",),
    nets=("LAMP",),
    margin=-0.002,
    unit="A",
    message="XU3 is asked for 22 mA and gives 20 mA.",
    location=Location(DECK, 12),
)


def waiver(**stated):
    """Make a waiver of the lamp's finding."""
    usual = {"rule": "drive-current", "reason": "lamp test only, 10 ms", "location": PLACE}
    return Waiver(**{**usual, **stated})


def judged(finding, *waivers, deck=DECK, file="railguard.toml"):
    """Return the finding as it comes out, and what matched."""
    settings = Settings(waivers=waivers, file=file)
    (made,), matched = apply((finding,), settings, deck, DAY)
    return made, matched


@pytest.mark.parametrize(
    "stated",
    [
        {},
        {"designator": "XU3"},
        {"designator": "U3"},
        {"designator": "xu3"},
        {"net": "LAMP"},
        {"net": "lamp", "designator": "U3"},
        {"file": "lamp/*.cir"},
        {"file": "lamp/driver.cir"},
        {"file": "**/driver.cir"},
        {"file": "**"},
        {"file": "lamp\\*.cir"},
        {"until": dt.date(2027, 1, 31)},
        {"accepted": -0.002},
        {"accepted": -0.003},
    ],
)
def test_a_finding_is_waived_where_all_that_is_stated_fits(stated):
    """The finding stays and carries the waiver."""
    made, matched = judged(LAMP, waiver(by="hardware lead", **stated))
    until = stated["until"].isoformat() if "until" in stated else ""
    note = WaiverNote("lamp test only, 10 ms", "hardware lead", until, PLACE)
    assert made == msgspec.structs.replace(LAMP, waiver=note)
    assert matched == {0}


@pytest.mark.parametrize(
    "stated",
    [
        {"rule": "drive-power"},
        {"designator": "XU4"},
        {"designator": "U31"},
        {"net": "OUT"},
        {"designator": "XU3", "net": "OUT"},
        {"file": "*.cir"},
        {"file": "driver.cir"},
        {"file": "lamp/*.net"},
        {"file": "lamp/**/x/*.cir"},
    ],
)
def test_a_finding_is_not_waived_where_something_stated_does_not_fit(stated):
    """It comes out as it went in."""
    assert judged(LAMP, waiver(**stated)) == (LAMP, frozenset())


def test_the_glob_is_taken_from_the_settings_file_s_folder():
    """Whatever folder the run was started in."""
    stated = waiver(file="lamp/*.cir")
    inside = judged(LAMP, stated, deck="station/lamp/driver.cir", file="station/railguard.toml")
    outside = judged(LAMP, stated, deck="lamp/driver.cir", file="station/railguard.toml")
    absolute = judged(LAMP, stated, deck=str(Path("lamp/driver.cir").absolute()))
    assert [found[0].waiver is not None for found in (inside, outside, absolute)] == [
        True,
        False,
        True,
    ]


@pytest.mark.parametrize(
    ("pattern", "deck", "taken"),
    [
        ("lamp/*.cir", "lamp/driver.cir", True),
        ("lamp/*.cir", "lamp/old/driver.cir", False),
        ("**/driver.cir", "driver.cir", True),
        ("**/driver.cir", "lamp/old/driver.cir", True),
        ("lamp/**/driver.cir", "lamp/driver.cir", True),
        ("lamp/**/driver.cir", "lamp/a/b/driver.cir", True),
        ("lamp/**/driver.cir", "driver.cir", False),
        ("lamp/**", "lamp/driver.cir", True),
        ("lamp/**", "gauge/driver.cir", False),
        ("lamp/**", "lamp.cir", False),
        ("lamp/old/**/**", "driver.cir", False),
        ("lamp\\*.cir", "lamp/driver.cir", True),
        ("*.CIR", "driver.cir", False),
    ],
)
def test_which_decks_a_glob_takes_in(pattern, deck, taken):
    """`*` stays in a folder, `**` goes through any number of them, after what stands before it."""
    found, _ = judged(LAMP, waiver(file=pattern), deck=deck)
    assert (found.waiver is not None) == taken


def test_an_expired_waiver_is_a_finding_again_and_says_so():
    """It still matches: it is no leftover."""
    made, matched = judged(LAMP, waiver(until=dt.date(2027, 1, 30)))
    assert made.waiver is None
    assert made.message == (
        "XU3 is asked for 22 mA and gives 20 mA. The waiver of railguard.toml, line 31 "
        "(lamp test only, 10 ms) expired on 2027-01-30."
    )
    assert matched == {0}


def test_a_margin_worse_than_the_accepted_one_is_a_finding_again():
    """With both numbers."""
    made, matched = judged(LAMP, waiver(accepted=-0.0015))
    assert made.waiver is None
    assert made.message.endswith(
        "(lamp test only, 10 ms) accepts a margin of -1.5 mA, and it is -2 mA now."
    )
    assert matched == {0}


def test_an_accepted_margin_needs_a_margin_to_compare():
    """What has no number may be worse."""
    finding = msgspec.structs.replace(LAMP, margin=None)
    made, _ = judged(finding, waiver(accepted=-0.002))
    assert made.waiver is None
    assert made.message.endswith("accepts a margin of -2 mA, and this finding has none to compare.")


def test_a_waiver_that_holds_goes_before_one_that_does_not():
    """A renewed waiver beside the expired one."""
    made, matched = judged(
        LAMP, waiver(until=dt.date(2026, 1, 1)), waiver(reason="renewed", designator="U3")
    )
    assert made.waiver is not None
    assert made.waiver.reason == "renewed"
    assert matched == {0, 1}


class TestConsequences:
    """A waiver accepts what it names and nothing else."""

    CLIPPED = Finding(
        rule="headroom-output",
        family="headroom",
        severity="major",
        designators=("XU3",),
        message="The output of XU3 is clipped.",
        cause="XU3",
        location=Location(DECK, 12),
    )
    CAUSE = msgspec.structs.replace(LAMP, consequences=(CLIPPED,))

    def test_what_follows_from_an_accepted_finding_stands_on_its_own(self):
        """Nothing is silenced that nobody accepted."""
        found, matched = apply((self.CAUSE,), Settings(waivers=(waiver(),)), DECK, DAY)
        assert [(f.rule, f.waiver is not None, f.consequences) for f in found] == [
            ("drive-current", True, ()),
            ("headroom-output", False, ()),
        ]
        assert matched == {0}

    def test_a_consequence_can_be_accepted_as_well(self):
        """Then it stays under its cause."""
        both = Settings(waivers=(waiver(), waiver(rule="headroom-output")))
        (made,), matched = apply((self.CAUSE,), both, DECK, DAY)
        assert made.waiver is not None
        assert [f.waiver is not None for f in made.consequences] == [True]
        assert matched == {0, 1}

    def test_a_consequence_accepted_alone_leaves_its_cause(self):
        """The cause still holds."""
        settings = Settings(waivers=(waiver(rule="headroom-output"),))
        (made,), _ = apply((self.CAUSE,), settings, DECK, DAY)
        assert made.waiver is None
        assert [f.waiver is not None for f in made.consequences] == [True]


@pytest.mark.parametrize(
    ("stated", "written", "same"),
    [
        ("XCH1.XU2", "XCH1.XU2", True),
        ("CH1.U2", "XCH1.XU2", True),
        ("ch1.u2", "XCH1.XU2", True),
        ("U2", "X_U2", True),
        ("U2", "X§U2", True),
        ("U2", "XCH1.XU2", False),
        ("1", "X1", False),
    ],
)
def test_a_designator_counts_in_either_spelling(stated, written, same):
    """The netlist's or the schematic's, whole paths only."""
    assert same_designator(stated, written) is same


class TestStale:
    """Waivers that match nothing over the whole run."""

    SETTINGS = Settings(
        waivers=(
            waiver(designator="XU3", net="LAMP", file="lamp/*.cir"),
            waiver(rule="bias-level", reason="by design"),
        ),
        file="railguard.toml",
        rules_off=("bias-level",),
    )

    def test_each_is_a_remark_with_its_line(self):
        """It says what was waived, and why nothing matched where that is known."""
        first, second = stale(self.SETTINGS, ())
        assert (first.rule, first.severity) == ("netlist-waiver-stale", "remark")
        assert first.location == PLACE
        assert first.message == (
            "The waiver of drive-current on XU3 and net LAMP in lamp/*.cir "
            "(lamp test only, 10 ms) matches no finding of this run."
        )
        assert second.message == (
            "The waiver of bias-level (by design) matches no finding of this run, "
            "as the rule is switched off."
        )

    def test_one_that_matched_is_none(self):
        """In any deck of the run."""
        assert [f.nets for f in stale(self.SETTINGS, {0})] == [()]
        assert stale(self.SETTINGS, {0, 1}) == ()

    def test_one_for_files_outside_the_run_is_left_out(self):
        """A hook sees one netlist of many."""
        assert [f.nets for f in stale(self.SETTINGS, (), ["gauge/bridge.cir"])] == [()]
        assert len(stale(self.SETTINGS, (), ["gauge/bridge.cir", "lamp/driver.cir"])) == 2

    def test_the_remark_can_be_switched_off_and_weighed(self):
        """It is a rule like the others."""
        off = msgspec.structs.replace(self.SETTINGS, rules_off=("netlist-waiver-stale",))
        assert stale(off, ()) == ()
        graver = msgspec.structs.replace(
            self.SETTINGS, severities={"netlist-waiver-stale": "minor"}
        )
        assert {f.severity for f in stale(graver, ())} == {"minor"}

    def test_it_has_the_form_of_any_finding(self):
        """Family, basis and subject; what a waiver does not name stays empty."""
        first, second = stale(self.SETTINGS, ())
        assert (first.family, first.basis) == ("netlist", ("user",))
        assert (first.designators, first.nets) == (("XU3",), ("LAMP",))
        assert (second.designators, second.nets) == ((), ())


def test_all_findings_of_a_run_come_out_and_all_that_matched_is_told():
    """Waived or not, with what follows from them; dates count for consequences as well."""
    clipped = msgspec.structs.replace(
        TestConsequences.CLIPPED, designators=("XU4",), location=Location(DECK, 20)
    )
    cause = msgspec.structs.replace(LAMP, consequences=(clipped,))
    other = msgspec.structs.replace(LAMP, rule="bias-level", family="bias")
    waivers = (
        waiver(),
        waiver(rule="headroom-output", until=DAY),
        waiver(rule="bias-level", until=DAY),
        waiver(rule="drive-power"),
    )
    found, matched = apply((cause, other), Settings(waivers=waivers), DECK, DAY)
    assert [(f.rule, f.waiver is not None, len(f.consequences)) for f in found] == [
        ("bias-level", True, 0),
        ("drive-current", True, 1),
    ]
    assert found[1].consequences[0].waiver is not None
    assert matched == {0, 1, 2}


def test_an_accepted_margin_of_nothing_holds_for_nothing():
    """The limit itself is reached, as was accepted."""
    made, _ = judged(msgspec.structs.replace(LAMP, margin=0.0), waiver(accepted=0.0))
    assert made.waiver is not None


def test_a_waiver_stated_nowhere_is_told_without_a_place():
    """One made by a program has no line."""
    made, _ = judged(LAMP, waiver(until=dt.date(2027, 1, 30), location=None))
    assert made.message.endswith("The waiver (lamp test only, 10 ms) expired on 2027-01-30.")


def test_a_deck_on_another_drive_is_among_no_files(monkeypatch):
    """On Windows there is no way from the settings' drive to it, whatever the glob."""
    monkeypatch.setattr("os.path.relpath", ntpath.relpath)
    file = "C:/station/railguard.toml"
    made, matched = judged(LAMP, waiver(file="**"), deck="D:/old/driver.cir", file=file)
    assert (made.waiver, matched) == (None, frozenset())
