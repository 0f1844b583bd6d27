"""A stage that a settings file or a comment card speaks of and no netlist has."""

import sqlite3
from contextlib import closing

import pytest
from click.testing import CliRunner

from railguard.commands.audit import audit
from railguard.reviewing import review

RULE = "netlist-stage-unknown"
DECK = """{title}
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
VIN in 0 SIN(0 1 1k)
{name} in out vp vn out TL072
RL out 0 10k
{card}
.end
"""


@pytest.fixture
def written(tmp_path):
    """Write netlists and a settings file; return the folder."""

    def write(settings, **decks):
        (tmp_path / "railguard.toml").write_text(settings)
        for path, name in decks.items():
            file = tmp_path / f"{path.replace('__', '/')}.cir"
            file.parent.mkdir(exist_ok=True)
            file.write_text(DECK.format(title=path, name=name, card=""))
        return tmp_path

    return write


def strays(found):
    """Return the remarks on stages, those of the run and of its netlists."""
    every = (*found.findings, *(f for d in found.designs for f in d.findings))
    return [f for f in every if f.rule == RULE]


XU9 = '[stages]\n"XU9" = { use = "comparator" }\n'


def test_a_designator_the_netlist_lacks_is_told(written):
    """With its line, and the nearest one."""
    folder = written(XU9, level="XU1")
    (found,) = strays(review(folder / "level.cir"))
    assert found.severity == "remark"
    assert found.location.line == 2
    assert found.message.startswith("[stages] speaks of XU9, an op-amp this netlist does not have")
    assert found.remedy.startswith("The nearest is XU1")


@pytest.mark.parametrize("name", ["XU1", "xu1", "U1", "u1"])
def test_either_spelling_is_known(written, name):
    """As in the netlist and as on the schematic, in any case."""
    folder = written(XU9.replace("XU9", name), level="XU1")
    assert strays(review(folder / "level.cir")) == []


def test_pins_count_as_well(written):
    """An entry that states pins alone."""
    folder = written(
        '[stages]\n"XU9" = { pins = ["in+", "in-", "v+", "v-", "out"] }\n', level="XU1"
    )
    assert len(strays(review(folder / "level.cir"))) == 1


def test_what_is_no_op_amp_is_told(written):
    """A resistor is no stage."""
    folder = written(XU9.replace("XU9", "RL"), level="XU1")
    assert len(strays(review(folder / "level.cir"))) == 1


def test_one_netlist_of_a_run_is_enough(written):
    """Two boards share a file: what one has is not missing from the other."""
    folder = written(XU9, level="XU1", flow="XU9")
    both = [folder / "level.cir", folder / "flow.cir"]
    assert strays(review(both)) == []
    (found,) = strays(review([both[0], both[0]]))
    assert "no netlist of this run has" in found.message


def test_a_file_above_all_netlists_is_for_others_too(written):
    """A file for a folder of boards says nothing of the board at hand."""
    folder = written(XU9, boards__level="XU1")
    assert strays(review(folder / "boards" / "level.cir")) == []


def test_a_card_speaks_of_its_own_netlist(written):
    """Whatever others the run has."""
    folder = written("", flow="XU9")
    card = DECK.format(title="level", name="XU1", card="* railguard: use XU9 comparator")
    (folder / "level.cir").write_text(card)
    found = review([folder / "level.cir", folder / "flow.cir"])
    (told,) = strays(found)
    assert told in found.designs[0].findings
    assert told.location.line == 9
    assert told.message.startswith("A directive speaks of XU9")


def test_it_can_be_switched_off_and_weighed(written):
    """As any rule."""
    folder = written(f'{XU9}[review]\noff = ["{RULE}"]\n', level="XU1")
    assert strays(review(folder / "level.cir")) == []
    folder = written(f'{XU9}[severity]\n{RULE} = "minor"\n', level="XU1")
    assert [f.severity for f in strays(review(folder / "level.cir"))] == ["minor"]


def test_an_audit_with_one_file_for_all_is_quiet(tmp_path, written):
    """Ten thousand netlists share it; each is judged by itself."""
    folder = written(XU9, level="XU1", flow="XU2")
    place = tmp_path / "audit.sqlite"
    settings = str(folder / "railguard.toml")
    options = ["--to", str(place), "--workers", "1", "--settings", settings]
    result = CliRunner().invoke(audit, [str(folder), *options])
    assert result.exception is None
    with closing(sqlite3.connect(place)) as base:
        designs = base.execute("SELECT count(*) FROM file WHERE state = 'design'").fetchone()
        told = base.execute("SELECT count(*) FROM finding WHERE rule = ?", [RULE]).fetchone()
    assert (designs, told) == ((2,), (0,))
