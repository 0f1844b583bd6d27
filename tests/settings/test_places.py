"""Where the keys of a TOML text stand."""

import tomllib

import pytest

from railguard.settings.places import places

TEXT = '''# a station
[review]
hold-at = "major"   # comment = "no key"
off = [
  "one",  # first
  "two",
]
[nets]
"VBAT" = { volts = 12.0, tolerance = "10 %" }
'/lit eral' = {volts=1}
a . b = 3
[limits.headroom-output]
reserve-share = 0.05
text = """
[not a section]
key = "no"
"""
quote = \'\'\'it''s\'\'\'
[[waivers]]
rule = "first"
[[waivers]]
rule = "second"
until = 2027-06-30 07:32:00
[waivers.more]
deep = [{ x = 1 }, { x = [1, 2] }]
'''


@pytest.mark.parametrize(
    ("path", "line", "column", "length"),
    [
        (("review",), 2, 2, 6),
        (("review", "hold-at"), 3, 1, 7),
        (("review", "off"), 4, 1, 3),
        (("review", "off", 0), 5, 3, 5),
        (("review", "off", 1), 6, 3, 5),
        (("nets", "VBAT"), 9, 1, 6),
        (("nets", "VBAT", "tolerance"), 9, 26, 9),
        (("nets", "/lit eral", "volts"), 10, 16, 5),
        (("nets", "a", "b"), 11, 5, 1),
        (("limits", "headroom-output"), 12, 9, 15),
        (("limits", "headroom-output", "reserve-share"), 13, 1, 13),
        (("limits", "headroom-output", "quote"), 18, 1, 5),
        (("waivers", 0), 19, 3, 7),
        (("waivers", 0, "rule"), 20, 1, 4),
        (("waivers", 1), 21, 3, 7),
        (("waivers", 1, "rule"), 22, 1, 4),
        (("waivers", 1, "until"), 23, 1, 5),
        (("waivers", 1, "more", "deep", 1, "x"), 25, 22, 1),
    ],
)
def test_a_key_is_found_where_it_stands(path, line, column, length):
    """Line, column and length of the key, whatever stands round it."""
    found = places(TEXT, "railguard.toml")[path]
    assert (found.file, found.line, found.column, found.length) == (
        "railguard.toml",
        line,
        column,
        length,
    )


def _paths(value, path=()):
    """Yield the path of every value `tomllib` gives."""
    if path:
        yield path
    if isinstance(value, dict):
        for key, inner in value.items():
            yield from _paths(inner, (*path, key))
    elif isinstance(value, list):
        for index, inner in enumerate(value):
            yield from _paths(inner, (*path, index))


@pytest.mark.parametrize(
    "text",
    [
        TEXT,
        TEXT.replace("\n", "\r\n"),
        "",
        "# only a comment",
        'a = ""\nb = """"""\nc = \'\'\nd = "\\""\ne = """\\""""',
        'f = """two quotes before the end"""""\ng = 1',
        "a = [[], [[]], {}, { b = {} }]\nc = 1979-05-27T07:32:00Z\nd = [1,2,]",
        '"quoted.dot" = 1\n"tab\\tkey" = 2\n"uni\\u00e9" = 3\n\'it"s\' = 4',
        "[a.b.c]\nd = 1\n[a]\ne = 2\n[[a.f]]\n[[a.f]]\n[a.f.g]\nh = 1\n[[a.f.i]]\nj = 1",
        "a = 1 # ] } , =\nb = [ # ] comment\n 1 # , 2\n , 3 ]",
        "x.y.z = 1\nx.y.w = 2\n[ spaced . header ]\nq = true",
    ],
)
def test_no_key_is_missed_and_none_is_invented(text):
    """The paths are those of the parser that gives the values."""
    assert set(places(text, "t")) == set(_paths(tomllib.loads(text)))
