"""Demand against limit at the corners, on derivatives made up for the test."""

import numpy as np
import pytest

from railguard.analysis.available import Reach
from railguard.analysis.bound import Pair
from railguard.analysis.bounds import bound
from railguard.analysis.corners import Parameter, Spread

REACH = Reach(10.5, 9.5, "memory", "practice", "10 kΩ load")
NAMES = ("R1", "R2", "VP", "VN")
DELTA = (0.01, 0.02, 0.05, 0.05)
STATED = (True, False, False, False)
MOVES = (10.0, -20.0, 0.0, 5.0)
LIMIT_MOVES = (0.0, 0.0, 12.0, 5.0)


def made(names=NAMES, delta=DELTA, stated=STATED, **fields):
    """Make the upper bound of an output asked for 9 V, whose rail carries its limit."""
    nothing = np.zeros((1, len(delta)))
    off = Spread(
        parameters=tuple(Parameter(name) for name in names),
        delta=np.array(delta), stated=np.array(stated, dtype=bool),
        error=np.zeros(len(delta), dtype=bool), high=nothing, low=nothing,
    )  # fmt: skip
    usual = {
        "upper": True, "demand": 9.0, "level": 0.5, "span": 17.0, "reach": REACH,
        "absolute": 12.0, "absolute_basis": "user", "demand_basis": "assumed",
        "moves": np.array(MOVES), "limit_moves": np.array(LIMIT_MOVES),
    }  # fmt: skip
    return bound(spread=off, **{**usual, **fields})


def close(pair):
    """Compare a corner as numbers."""
    return Pair(pytest.approx(pair[0]), pytest.approx(pair[1]))


def test_numbers_and_their_bases_are_passed_on():
    """As they came from reach and solution."""
    found = made()
    assert (found.upper, found.demand, found.level, found.span) == (True, 9.0, 0.5, 17.0)
    assert (found.typical, found.guaranteed, found.absolute) == (10.5, 9.5, 12.0)
    assert (found.typical_basis, found.guaranteed_basis) == ("memory", "practice")
    assert (found.absolute_basis, found.demand_basis) == ("user", "assumed")
    assert found.condition == "10 kΩ load"


def test_at_the_corner_everything_takes_room_away():
    """10 x 1 % and 20 x 2 % raise the demand, 12 x 5 % lowers the limit; VN moves both alike."""
    assert made().default == close((9.0 + 0.1 + 0.4, 9.5 - 0.6))


def test_at_the_lower_end_the_same_takes_it_from_the_other_side():
    """The demand goes down and the limit comes up."""
    assert made(upper=False).default == close((9.0 - 0.1 - 0.4, 9.5 + 0.6))


def test_a_corner_of_what_is_stated_moves_nothing_else():
    """R1 alone is stated; where nothing is, there is no such corner."""
    assert made().stated == close((9.1, 9.5))
    assert made(stated=(False,) * 4).stated is None


def test_the_limit_of_a_corner_is_the_guaranteed_one_where_there_is_one():
    """Else the typical one; without either there is no corner to speak of."""
    typical = made(reach=Reach(10.5, None, "memory", "catalogue"))
    assert typical.default == close((9.5, 10.5 - 0.6))
    none = made(reach=Reach(None, None, "memory", "catalogue"))
    assert (none.stated, none.default, none.culprits) == (None, None, ())


def test_three_culprits_the_heaviest_first():
    """By what they take of the room; what moves demand and limit alike takes none."""
    assert made().culprits == ("VP", "R2", "R1")
    five = made(
        names=("A", "B", "C", "D", "E"), delta=(1.0,) * 5, stated=(False,) * 5,
        moves=np.array([1.0, 5.0, 3.0, 4.0, 2.0]), limit_moves=np.zeros(5),
    )  # fmt: skip
    assert five.culprits == ("B", "D", "C")
    alike = np.array([1.0, 5.0])
    two = made(
        names=("A", "VN"), delta=(0.1, 0.1), stated=(False, False), moves=alike,
        limit_moves=np.array([0.0, 5.0]),
    )  # fmt: skip
    assert two.culprits == ("A",)


def test_microvolts_are_ranked_as_volts_are():
    """What is compared is each one's share of the heaviest, however small that is."""
    small = 1e-9
    found = made(moves=np.array(MOVES) * small, limit_moves=np.array(LIMIT_MOVES) * small)
    assert found.culprits == made().culprits == ("VP", "R2", "R1")


def test_of_many_alike_the_first_are_named():
    """In the order of the netlist, as many as there may be: every third weighs most."""
    names = tuple(f"R{k}" for k in range(600))
    found = made(
        names=names, delta=(0.01,) * 600, stated=(False,) * 600,
        moves=np.tile([0.5, 1.0, 0.25], 200), limit_moves=np.zeros(600),
    )  # fmt: skip
    assert found.culprits == ("R1", "R4", "R7")


def test_a_culprit_is_named_once():
    """Two entries of one part are one part."""
    assert made(names=("R1", "R2", "VP", "VP")).culprits == ("VP", "R2", "R1")
    assert made(names=("R1", "R1", "VP", "VN")).culprits == ("VP", "R1")


def test_an_exact_corner_is_solved_and_not_followed():
    """It is asked for the shares that take the room away, and gives demand and limit's way."""
    asked = []

    def exact(shares):
        asked.append(list(shares))
        return 9.45, -0.7

    found = made(exact=exact)
    assert asked == [[1, 0, 0, 0], [1, -1, -1, 0]]
    assert (found.stated, found.default) == (close((9.45, 8.8)), close((9.45, 8.8)))


def test_nothing_that_may_be_off_is_no_corner():
    """A circuit of ideal parts has its nominal numbers only."""
    none = made(names=(), delta=(), stated=(), moves=np.zeros(0), limit_moves=np.zeros(0))
    assert (none.stated, none.default, none.culprits) == (None, None, ())
    assert none.demand == 9.0
