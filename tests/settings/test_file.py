"""The user's file: where it is looked for, what it states, and how faults in it are told."""

import datetime as dt
from pathlib import Path

import pytest

from railguard.deck.bounds import Bounds
from railguard.errors import SettingsError
from railguard.settings.file import FILE_NAME, find, load, parse
from railguard.settings.model import Load, NetLevel, Settings, Signal, Tolerances
from railguard.settings.sections import BOUNDS

NAME = "railguard.toml"

WHOLE = """
[review]
hold-at = "minor"
kind = "board"
off = ["decoupling-bulk"]
require = ["headroom", "decoupling"]
[severity]
feedback-low = "remark"
[conditions]
ambient = [-20, 60]
[nets]
"VBAT" = { volts = 12.0, tolerance = "10 %" }
[signals]
"LEVEL" = { low = 0.5, high = 4.5, to = 200 }
"bridge" = { between = ["S+", "S-"], peak = 0.01, common = 2.5, ohms = 350, to = 20 }
"LOOP" = { amps = [0.004, 0.020], to = 10, group = "loop" }
"TIDE" = { peak = "50 mV", from = "0.1", to = "1.5 kHz" }
[loads]
"LINE_OUT" = { ohms = 600, farads = 1e-9, to = "0", max-volts = 3.3 }
[stages]
"XU3" = { use = "comparator" }
"XU4" = { pins = ["in+", "in-", "v+", "v-", "out"] }
[tolerances]
resistor = "1 %"
rail = 0.02
"R1*" = "0.1 %"
R7 = 0.05
[limits.headroom-output]
reserve-share = 0.05
room = "50 mV"
[limits.dynamics-slew]
off = true
[[waivers]]
rule = "drive-current"
designator = "XU3"
file = "lamp/*.cir"
reason = "lamp test only, 10 ms"
by = "hardware lead"
accepted = -0.002
until = 2027-06-30
[[devices]]
family = "OURS"
"""


def fault(text):
    """Return the error a text is refused with."""
    with pytest.raises(SettingsError) as caught:
        parse(text, NAME)
    return caught.value


def line_of(text, part):
    """Return the line a part of a text stands on."""
    return text[: text.index(part)].count("\n") + 1


class TestStatements:
    """Everything that can be stated becomes one value."""

    def test_nothing_stated_gives_the_defaults(self):
        """An empty file is a file all the same."""
        assert parse("", NAME) == Settings(file=NAME)

    def test_the_review_section(self):
        """Hold level, kind, rules switched off, families required."""
        made = parse(WHOLE, NAME)
        assert (made.hold_at, made.kind, made.file) == ("minor", "board", NAME)
        assert made.require == ("headroom", "decoupling")
        assert made.rules_off == ("decoupling-bulk", "dynamics-slew")
        assert made.severities == {"feedback-low": "remark"}
        assert made.ambient == (-20.0, 60.0)

    def test_nets_and_loads(self):
        """SI numbers, tolerances as shares, each with its place."""
        made = parse(WHOLE, NAME)
        vbat = made.nets["VBAT"]
        assert vbat == NetLevel(12.0, 0.1, vbat.location)
        assert vbat.location.line == line_of(WHOLE, '"VBAT"')
        assert made.loads == (
            Load(
                net="LINE_OUT",
                ohms=600.0,
                farads=1e-9,
                to="0",
                max_volts=3.3,
                location=made.loads[0].location,
            ),
        )

    def test_signals_in_all_their_forms(self):
        """Ranges, differential, currents, peaks, bands and groups."""
        level, bridge, loop, tide = parse(WHOLE, NAME).signals
        assert level == Signal(name="LEVEL", low=0.5, high=4.5, stop=200.0, location=level.location)
        assert bridge == Signal(
            name="bridge",
            between=("S+", "S-"),
            low=-0.01,
            high=0.01,
            common=2.5,
            ohms=350.0,
            stop=20.0,
            location=bridge.location,
        )
        assert loop == Signal(
            name="LOOP",
            current=True,
            low=0.004,
            high=0.020,
            stop=10.0,
            group="loop",
            location=loop.location,
        )
        assert tide == Signal(
            name="TIDE", low=-0.05, high=0.05, start=0.1, stop=1500.0, location=tide.location
        )

    def test_stages_and_tolerances(self):
        """Uses, pins, classes and patterns in their order."""
        made = parse(WHOLE, NAME)
        assert made.uses == {"XU3": "comparator"}
        assert made.pins == {"XU4": ("in+", "in-", "v+", "v-", "out")}
        assert made.tolerances == Tolerances(
            resistor=0.01, rail=0.02, rules=(("R1*", 0.001), ("R7", 0.05))
        )

    def test_limits_waivers_and_devices(self):
        """Limits by rule; waivers whole; devices as they stand, with their line."""
        made = parse(WHOLE, NAME)
        assert made.limits == {"headroom-output": {"reserve-share": 0.05, "room": 0.05}}
        (waiver,) = made.waivers
        assert (waiver.rule, waiver.designator, waiver.file) == (
            "drive-current",
            "XU3",
            "lamp/*.cir",
        )
        assert (waiver.reason, waiver.by) == ("lamp test only, 10 ms", "hardware lead")
        assert (waiver.accepted, waiver.until) == (-0.002, dt.date(2027, 6, 30))
        assert waiver.location.line == line_of(WHOLE, "[[waivers]]")
        ((device, place),) = made.devices
        assert device == {"family": "OURS"}
        assert place.line == line_of(WHOLE, "[[devices]]")

    def test_every_rule_that_is_named_is_kept_with_its_place(self):
        """So that a misspelt one is found once the rules are known."""
        named = {(n.rule, n.limit, n.unit): n.location.line for n in parse(WHOLE, NAME).named}
        assert named == {
            ("decoupling-bulk", "", ""): line_of(WHOLE, "off = ["),
            ("feedback-low", "", ""): line_of(WHOLE, "feedback-low"),
            ("headroom-output", "", ""): line_of(WHOLE, "[limits.headroom-output]"),
            ("headroom-output", "reserve-share", ""): line_of(WHOLE, "reserve-share"),
            ("headroom-output", "room", "V"): line_of(WHOLE, "room ="),
            ("dynamics-slew", "", ""): line_of(WHOLE, "[limits.dynamics-slew]"),
            ("drive-current", "", ""): line_of(WHOLE, "[[waivers]]"),
        }

    def test_one_ambient_is_a_range_of_no_width(self):
        """A station in a heated cabinet has one temperature."""
        assert parse('[conditions]\nambient = "40 °C"', NAME).ambient == (40.0, 40.0)

    def test_a_day_may_be_written_as_text(self):
        """With or without quotes."""
        text = '[[waivers]]\nrule = "a"\nreason = "b"\nuntil = "2027-06-30"'
        assert parse(text, NAME).waivers[0].until == dt.date(2027, 6, 30)

    def test_a_rule_that_is_not_off_stays_on(self):
        """`off = false` says so in words."""
        assert parse("[limits.headroom-output]\noff = false", NAME).rules_off == ()


def test_bounds_are_those_of_the_reader():
    """Every bound on reading can be set, and none else."""
    text = "[bounds]\n" + "\n".join(f"{key} = {k + 1}" for k, key in enumerate(BOUNDS))
    bounds = Bounds(**parse(text, NAME).bounds)
    fields = [field.replace("_", "-") for field in Bounds.__struct_fields__]
    assert set(BOUNDS) == set(fields)
    assert bounds.elements == BOUNDS.index("elements") + 1
    with pytest.raises(SettingsError, match="bounds"):
        parse("[bounds]\nelements = 0", NAME)


@pytest.mark.parametrize(
    ("text", "line", "what", "remedy"),
    [
        (
            "[reviw]\nkind = 1",
            1,
            'The settings file has no field "reviw".',
            'The nearest is "review". Known here: bounds, conditions, devices, limits, loads, '
            "nets, review, severity, signals, stages, tolerances, waivers.",
        ),
        (
            "[review]\n\nhold_at = 'major'",
            3,
            'The section [review] has no field "hold_at".',
            'The nearest is "hold-at". Known here: hold-at, kind, off, require.',
        ),
        (
            "[review]\nhold-at = 'majr'",
            2,
            'The section [review] cannot have "majr" as its hold-at.',
            'The nearest is "major". Known here: critical, major, minor, remark.',
        ),
        (
            "[review]\nrequire = ['headrom']",
            2,
            'The section [review] requires "headrom", which is no family of rules.',
            'The nearest is "headroom". Known here: bias, decoupling, drive, dynamics, feedback, '
            "headroom, netlist, stability, supply.",
        ),
        (
            "[review]\noff = 'bias-level'",
            2,
            "The section [review] needs a list as its off.",
            "",
        ),
        (
            "[review]\noff = [1]",
            2,
            "The section [review] needs texts in its off.",
            "Put each in quotes.",
        ),
        (
            "[severity]\nbias-level = 'off'",
            2,
            "The section [severity] cannot switch bias-level off.",
            'Write off = ["bias-level"] under [review].',
        ),
        (
            "[nets]\nVBAT = 12",
            2,
            'The net "VBAT" needs named fields.',
            "Write them in braces: { name = value }.",
        ),
        (
            "[nets]\nVBAT = { volt = 12 }",
            2,
            'The net "VBAT" has no field "volt".',
            'The nearest is "volts". Known here: tolerance, volts.',
        ),
        (
            "[nets]\nVBAT = {}",
            2,
            'The net "VBAT" says no volts.',
            "State its level in volts.",
        ),
        (
            "[nets]\nVBAT = { volts = '12 A' }",
            2,
            'The net "VBAT" cannot use its volts: "12 A" is in A, and V is wanted here.',
            "",
        ),
        (
            "[nets]\nVBAT = { volts = nan }",
            2,
            'The net "VBAT" cannot use its volts: "nan" is no number that can be used here.',
            "",
        ),
        (
            f"[nets]\nVBAT = {{ volts = 1{'0' * 400} }}",
            2,
            'The net "VBAT" cannot use its volts: "inf" is no number that can be used here.',
            "",
        ),
        (
            "[nets]\nVBAT = { volts = true }",
            2,
            'The net "VBAT" cannot use its volts: it is no number.',
            "",
        ),
        (
            "[nets]\nVBAT = { volts = 12, tolerance = 10 }",
            2,
            'The net "VBAT" cannot use its tolerance: 1000 % is no share from 0 to below 100 %.',
            'Write for example "5%" or 0.05.',
        ),
        (
            "[nets]\nVBAT = { volts = 12 }\nvbat = { volts = 5 }",
            3,
            '"vbat" and "VBAT" are one name to SPICE, stated twice.',
            "Keep one of them.",
        ),
        (
            "[signals]\nLEVEL = { low = 1 }",
            2,
            'The signal "LEVEL" says no high.',
            "State low and high, or peak.",
        ),
        (
            "[signals]\nLEVEL = { to = 1 }",
            2,
            'The signal "LEVEL" says no values.',
            "State low and high, or peak, or amps.",
        ),
        (
            "[signals]\nLEVEL = { low = 1, high = 2, peak = 3 }",
            2,
            'The signal "LEVEL" says its values in more than one way.',
            "State low and high, or peak, or amps.",
        ),
        (
            "[signals]\nLEVEL = { low = 2, high = 1 }",
            2,
            'The signal "LEVEL" has a low above its high.',
            "",
        ),
        (
            "[signals]\nLEVEL = { peak = 0 }",
            2,
            'The signal "LEVEL" needs peak above zero.',
            "",
        ),
        (
            "[signals]\nLEVEL = { peak = 1, common = 2 }",
            2,
            'The signal "LEVEL" has a common level and no between.',
            "Name its two nets: between.",
        ),
        (
            "[signals]\nbridge = { peak = 1, between = ['S+'] }",
            2,
            'The signal "bridge" needs two different nets as its between.',
            "",
        ),
        (
            "[signals]\nLEVEL = { peak = 1, from = 20, to = 10 }",
            2,
            'The signal "LEVEL" needs a to that is not below its from.',
            "",
        ),
        (
            "[signals]\nLOOP = { amps = [0.02, 0.004] }",
            2,
            'The signal "LOOP" gives its amps with the higher number first.',
            "",
        ),
        (
            "[signals]\nLOOP = { amps = [0.02] }",
            2,
            'The signal "LOOP" needs two numbers as its amps: the lowest and the highest.',
            "",
        ),
        (
            "[signals]\nLEVEL = { peak = 1, to = '1M' }",
            2,
            'The signal "LEVEL" cannot use its to: "1M" leaves open whether M is mega or milli '
            "(SPICE takes it as milli): write MEG or m.",
            "",
        ),
        (
            "[loads]\nOUT = { ohms = 0 }",
            2,
            'The load on "OUT" needs ohms above zero.',
            "",
        ),
        (
            "[loads]\nOUT = { farads = -1e-9 }",
            2,
            'The load on "OUT" has a negative farads.',
            "",
        ),
        (
            "[loads]\nOUT = { to = 'A' }",
            2,
            'The load on "OUT" says nothing of it.',
            "State ohms, farads or max-volts.",
        ),
        (
            "[stages]\nXU3 = { use = 'komparator' }",
            2,
            'The stage "XU3" cannot have "komparator" as its use.',
            'The nearest is "comparator". Known here: comparator, linear, oscillator, unused.',
        ),
        (
            "[stages]\nXU3 = {}",
            2,
            'The stage "XU3" says nothing.',
            "State its use or its pins.",
        ),
        (
            "[stages]\nXU3 = { pins = ['in+', 'out'] }",
            2,
            'The stage "XU3" needs the name of every pin as its pins.',
            "Write for example in+ in- v+ v- out.",
        ),
        (
            "[tolerances]\nresistors = '1 %'",
            2,
            'The section [tolerances] knows no class "resistors".',
            'The nearest is "resistor". Known here: capacitor, inductor, rail, resistor. '
            "A pattern of designators has a digit or a * in it.",
        ),
        (
            "[conditions]\nambient = [60, -20]",
            2,
            "The section [conditions] gives its ambient with the higher number first.",
            "",
        ),
        (
            "[conditions]\nambient = -300",
            2,
            "The section [conditions] has an ambient below absolute zero.",
            "",
        ),
        (
            "[limits.headroom-output]\nroom = '4,7'",
            2,
            "The section [limits.headroom-output] cannot use its room: "
            '"4,7" has a comma: write the decimal point as a point.',
            "",
        ),
        (
            "[limits.headroom-output]\noff = 'yes'",
            2,
            "The section [limits.headroom-output] needs true or false as its off.",
            "",
        ),
        (
            "[limits]\nheadroom-output = 3",
            2,
            "The section [limits.headroom-output] needs named fields.",
            "Write them in braces: { name = value }.",
        ),
        (
            "[[waivers]]\nrule = 'drive-current'",
            1,
            "The waiver says no reason.",
            "A waiver has a rule and a reason.",
        ),
        (
            "[[waivers]]\nrule = 'a'\nreason = 'b'\n[[waivers]]\nrule = 'a'\nresaon = 'b'",
            6,
            'The waiver has no field "resaon".',
            'The nearest is "reason". Known here: accepted, by, designator, file, net, reason, '
            "rule, until.",
        ),
        (
            "[[waivers]]\nrule = 'a'\nreason = 'b'\nuntil = '30.6.2027'",
            4,
            'The waiver cannot use its until: "30.6.2027" is no day.',
            "Write year-month-day: 2027-06-30.",
        ),
        (
            "[[waivers]]\nrule = 'a'\nreason = 'b'\nuntil = 2027-06-30 12:00:00",
            4,
            'The waiver cannot use its until: "2027-06-30 12:00:00" is no day.',
            "Write year-month-day: 2027-06-30.",
        ),
        (
            "[[waivers]]\nrule = 'a'\nreason = 'b'\nby = 7",
            4,
            "The waiver needs a text as its by.",
            "Put it in quotes.",
        ),
        (
            "[waivers]\nrule = 'a'",
            1,
            "The section waivers is a list of tables.",
            "Write [[waivers]] before each.",
        ),
        (
            "devices = [1]",
            1,
            "The device needs named fields.",
            "Write them in braces: { name = value }.",
        ),
        (
            "[review]\nkind = board",
            2,
            "The settings file is no valid TOML: invalid value.",
            "Texts need quotes, and names with signs other than letters, digits, - and _ as well.",
        ),
        (
            "[review]\nkind = 'board'\n[review]",
            3,
            "The settings file is no valid TOML: cannot declare ('review',) twice.",
            "Texts need quotes, and names with signs other than letters, digits, - and _ as well.",
        ),
    ],
)
def test_what_cannot_be_obeyed_is_told_with_its_line(text, line, what, remedy):
    """The full sentence, the line, and the nearest valid name."""
    error = fault(text)
    assert (error.what, error.remedy) == (what, remedy)
    assert (error.where.file, error.where.line) == (NAME, line)


def test_nesting_without_end_is_refused():
    """A file is text from outside; it must not bring the program down."""
    assert "nested too deeply" in fault("a = " + "[" * 5000 + "]" * 5000).what


def test_a_number_without_end_is_refused():
    """Python converts no integer of more than some thousand digits."""
    assert fault("a = " + "9" * 5000).what == (
        "The settings file railguard.toml holds a number without end."
    )


class TestLoading:
    """A file on the disk, or about to be committed."""

    def test_a_file_is_read_from_the_disk(self, tmp_path):
        """With the byte order mark some editors write."""
        path = tmp_path / FILE_NAME
        path.write_bytes("\ufeff[review]\nkind = 'bench'".encode())
        assert load(path).kind == "bench"
        assert load(path).file == str(path)

    def test_a_hook_brings_the_bytes_itself(self):
        """What is about to be committed is not what is on the disk."""
        made = load(Path("somewhere.toml"), read=lambda path: b"[review]\nkind = 'board'")
        assert (made.kind, made.file) == ("board", "somewhere.toml")

    def test_a_file_that_is_not_there_is_an_error(self, tmp_path):
        """It was asked for by name."""
        with pytest.raises(SettingsError) as caught:
            load(tmp_path / "none.toml")
        assert "cannot be opened: No such file or directory." in caught.value.what

    def test_a_file_in_another_encoding_is_refused_with_the_line(self):
        """TOML is UTF-8."""
        with pytest.raises(SettingsError) as caught:
            load(Path("a.toml"), read=lambda path: b"[review]\n# \xb5")
        assert caught.value.what == "The settings file is no UTF-8."
        assert caught.value.where.line == 2

    def test_a_file_nobody_wrote_by_hand_is_refused(self):
        """The length is bounded."""
        with pytest.raises(SettingsError, match="longer than 1000000 bytes"):
            load(Path("a.toml"), read=lambda path: b"#" * 1_000_001)


class TestFinding:
    """Beside the netlist and upwards, never above the repository."""

    @pytest.fixture
    def station(self, tmp_path):
        """Lay out a repository `station` with a folder for the gauge."""
        (tmp_path / "station" / ".git").mkdir(parents=True)
        (tmp_path / "station" / "gauge").mkdir()
        return tmp_path / "station"

    def test_the_nearest_file_is_taken(self, station):
        """One beside the netlist goes before one at the root."""
        (station / FILE_NAME).touch()
        (station / "gauge" / FILE_NAME).touch()
        found = find(station / "gauge" / "bridge.cir")
        assert found == station / "gauge" / FILE_NAME

    def test_it_is_looked_for_up_to_the_root_of_the_repository(self, station):
        """The root itself included, from a netlist or from a folder."""
        (station / FILE_NAME).touch()
        assert find(station / "gauge" / "bridge.cir") == station / FILE_NAME
        assert find(station / "gauge") == station / FILE_NAME

    def test_it_is_never_looked_for_above_the_repository(self, station):
        """Whatever lies there belongs to something else."""
        (station.parent / FILE_NAME).touch()
        assert find(station / "gauge" / "bridge.cir") is None
        assert find(station / "gauge" / "bridge.cir", top=station.parent) is None

    def test_the_search_ends_where_the_run_ends(self, station):
        """`top` bounds it from above."""
        (station / FILE_NAME).touch()
        assert find(station / "gauge" / "bridge.cir", top=station / "gauge") is None

    def test_a_work_tree_of_a_repository_counts_as_one(self, tmp_path):
        """There `.git` is a file."""
        (tmp_path / "tree").mkdir()
        (tmp_path / "tree" / ".git").write_text("gitdir: elsewhere")
        (tmp_path / FILE_NAME).touch()
        assert find(tmp_path / "tree" / "a.cir") is None

    def test_without_a_repository_it_is_looked_for_up_to_the_home_folder(
        self, tmp_path, monkeypatch
    ):
        """The home folder itself included."""
        monkeypatch.setenv("HOME", str(tmp_path / "home"))
        monkeypatch.setenv("USERPROFILE", str(tmp_path / "home"))
        (tmp_path / "home" / "work").mkdir(parents=True)
        (tmp_path / "home" / FILE_NAME).touch()
        (tmp_path / FILE_NAME).touch()
        assert find(tmp_path / "home" / "work" / "a.cir") == tmp_path / "home" / FILE_NAME

    def test_outside_of_both_only_the_netlist_s_own_folder_counts(self, tmp_path, monkeypatch):
        """A file in a folder shared by all is nobody's intent."""
        monkeypatch.setenv("HOME", str(tmp_path / "home"))
        monkeypatch.setenv("USERPROFILE", str(tmp_path / "home"))
        (tmp_path / "shared" / "own").mkdir(parents=True)
        (tmp_path / "shared" / FILE_NAME).touch()
        assert find(tmp_path / "shared" / "own" / "a.cir") is None
        assert find(tmp_path / "shared" / "a.cir") == tmp_path / "shared" / FILE_NAME
