"""Misspelt names: the nearest valid one, and rules checked once they are known."""

import pytest

from railguard.errors import SettingsError
from railguard.settings.file import parse
from railguard.settings.names import advice, check_names, nearest

RULES = {
    "drive-current": {"reserve": "", "least": "A"},
    "headroom-output": {"reserve-share": ""},
    "bias-no-dc-path": {},
}


@pytest.mark.parametrize(
    ("word", "near"),
    [("headrom-output", "headroom-output"), ("DRIVE_CURRENT", "drive-current"), ("zzz", "")],
)
def test_the_nearest_name_is_found_whatever_its_case(word, near):
    """Underscores count as hyphens; nothing near gives nothing."""
    assert nearest(word, RULES) == near


def test_a_long_list_of_names_is_not_read_out():
    """Only the nearest is told."""
    assert advice("rule-7x", [f"rule-{n}" for n in range(20)]) == 'The nearest is "rule-7".'


@pytest.mark.parametrize(
    ("text", "line", "what"),
    [
        ('[review]\noff = [\n"drive-curent"]', 3, 'There is no rule "drive-curent".'),
        ('[severity]\ndrive-curent = "minor"', 2, 'There is no rule "drive-curent".'),
        ("[limits.drive-curent]\nreserve = 1", 1, 'There is no rule "drive-curent".'),
        ("[limits.drive-curent]\noff = true", 1, 'There is no rule "drive-curent".'),
        (
            '[[waivers]]\nrule = "drive-curent"\nreason = "a"',
            1,
            'There is no rule "drive-curent".',
        ),
        (
            "[limits.drive-current]\nreserv = 1",
            2,
            'The rule drive-current has no limit "reserv".',
        ),
        (
            "[limits.bias-no-dc-path]\nreserve = 1",
            2,
            'The rule bias-no-dc-path has no limits, so no "reserve".',
        ),
        (
            '[limits.drive-current]\nleast = "1 mV"',
            2,
            "The limit least of drive-current is in A, and the value is in V.",
        ),
        (
            '[limits.drive-current]\nreserve = "1 mV"',
            2,
            "The limit reserve of drive-current is a number without a unit, and the value is in V.",
        ),
    ],
)
def test_a_name_that_does_not_exist_is_refused_with_its_line(text, line, what):
    """Wherever the file names a rule."""
    with pytest.raises(SettingsError) as caught:
        check_names(parse(text, "railguard.toml"), RULES)
    assert caught.value.what == what
    assert caught.value.where.line == line


@pytest.mark.parametrize(
    "text",
    [
        "",
        '[limits.drive-current]\nreserve = "5 %"\nleast = "1 mA"',
        "[limits.headroom-output]\nreserve-share = 0.1\noff = true",
        '[review]\noff = ["bias-no-dc-path"]',
    ],
)
def test_names_that_exist_pass(text):
    """Shares may be written in per cent."""
    check_names(parse(text, "railguard.toml"), RULES)


def test_limits_may_be_given_by_name_alone():
    """Then no unit is checked."""
    check_names(parse("[limits.a]\nb = '1 mV'", "railguard.toml"), {"a": ("b",)})
