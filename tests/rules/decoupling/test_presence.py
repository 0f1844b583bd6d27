"""Whether a rail is decoupled: at its pins, to its return, often enough."""

import pytest

from railguard.rules.decoupling.presence import ABSENT, ACROSS, BEHIND, FEW
from tests.rules.stages import (
    capacitor,
    changed,
    design,
    findings,
    open_points,
    outcomes,
    package,
    rail,
    stage,
)

BARE = rail(decoupling=())


def whole(*rails, kind="board"):
    """Make a design of some rails."""
    packages = (package("U1"), package("U2"))
    return design(stage(), rails=rails, packages=packages, kind=kind)


@pytest.mark.parametrize("farads", [10e-9, 100e-9, 1e-6])
def test_a_decoupled_rail_is_quiet(farads):
    """Any capacitor from 10 nF to 1 µF counts."""
    one = rail(decoupling=(capacitor(farads=farads),))
    assert outcomes(ABSENT, one, whole(one)) == []


@pytest.mark.parametrize("farads", [9.9e-9, 1.01e-6, 100e-12, 10e-6])
def test_other_sizes_do_not_decouple(farads):
    """Smaller or larger ones leave the rail bare, and are named."""
    one = rail(decoupling=(capacitor(farads=farads),))
    (found,) = findings(ABSENT, one, whole(one))
    assert "What stands there is C1" in found.message


def test_a_bare_rail_names_all_its_packages():
    """None at all is major, for every package on the rail, with what to fit."""
    one = rail(decoupling=(), packages=("U1", "U2"))
    (found,) = findings(ABSENT, one, whole(one))
    assert (found.severity, found.designators, found.nets) == ("major", ("U1", "U2"), ("+12V",))
    assert found.remedy == "Fit 100 nF from +12V to 0 at each of U1 and U2."


def test_a_bench_gets_one_minor_finding_for_all_rails():
    """On a bench the lack of decoupling is told once."""
    other = rail("-12V", -12.0, decoupling=(), packages=("U1", "U2"))
    bench = whole(BARE, other, kind="bench")
    (found,) = findings(ABSENT, BARE, bench)
    assert (found.severity, found.designators) == ("minor", ("U1", "U2"))
    assert found.nets == ("+12V", "-12V")
    assert findings(ABSENT, other, bench) == []


def test_an_unreadable_capacitor_leaves_the_rail_open():
    """A capacitor without a value is no proof of either."""
    one = rail(decoupling=(capacitor("C7", None),))
    assert findings(ABSENT, one, whole(one)) == []
    (point,) = open_points(ABSENT, one, whole(one))
    assert "C7" in point.why


def test_the_return_itself_needs_no_capacitor():
    """A rail that is its own return is not judged."""
    one = rail("0", 0.0, decoupling=(), sign="negative")
    assert outcomes(ABSENT, one, whole(one)) == []


def test_a_rail_of_unknown_level_is_judged_all_the_same():
    """Decoupling needs no level."""
    one = rail("VBAT", None, decoupling=())
    assert len(findings(ABSENT, one, whole(one))) == 1


def test_one_for_each_package_is_enough():
    """Two packages with two capacitors draw nothing."""
    one = rail(decoupling=(capacitor("C1"), capacitor("C2")), packages=("U1", "U2"))
    assert outcomes(FEW, one, whole(one)) == []


def test_fewer_than_packages_is_minor_and_says_what_a_netlist_cannot_tell():
    """One for two is told, with how many more."""
    one = rail(packages=("U1", "U2"))
    (found,) = findings(FEW, one, whole(one))
    assert found.severity == "minor"
    assert "does not tell which" in found.message
    assert found.remedy.startswith("Fit 1 more of 100 nF")


def test_a_house_may_want_two_for_each_package():
    """One of two is told, two of two are not."""
    one, two = rail(), rail(decoupling=(capacitor("C1"), capacitor("C2")))
    (found,) = findings(FEW, one, whole(one), per_package=2.0)
    assert (found.demand, found.limit) == (2.0, 1.0)
    assert found.remedy.startswith("Fit 1 more of 100 nF")
    assert findings(FEW, two, whole(two), per_package=2.0) == []


def test_few_is_silent_where_none_is_or_on_a_bench():
    """None at all is another rule's; a bench is told once."""
    assert outcomes(FEW, BARE, whole(BARE)) == []
    one = rail(packages=("U1", "U2"))
    assert outcomes(FEW, one, whole(one, kind="bench")) == []


def test_few_does_not_count_what_has_no_value():
    """A capacitor of unknown value may be the missing one: not checked, and no claim."""
    one = rail(decoupling=(capacitor("C1"), capacitor("C2", None)), packages=("U1", "U2"))
    assert findings(FEW, one, whole(one)) == []
    assert len(open_points(FEW, one, whole(one))) == 1
    still = changed(one, packages=("U1", "U2", "U3"))
    assert len(findings(FEW, still, whole(still))) == 1


def test_a_capacitor_behind_a_ferrite_does_not_decouple():
    """On the source side of a series element it is told, and not called absent."""
    one = rail(decoupling=(), upstream=(capacitor(behind="FB1"),), series=("FB1",))
    (found,) = findings(BEHIND, one, whole(one))
    assert found.severity == "major"
    assert "source side of FB1" in found.message
    assert outcomes(ABSENT, one, whole(one)) == []
    (found,) = findings(BEHIND, one, whole(one, kind="bench"))
    assert found.severity == "minor"


@pytest.mark.parametrize(
    ("series", "words"), [(("FB1", "R9"), "FB1 and R9"), ((), "a series element")]
)
def test_what_stands_between_is_the_rail_s_where_a_capacitor_does_not_tell(series, words):
    """As far as anything is known of it."""
    one = rail(decoupling=(), upstream=(capacitor(),), series=series)
    (found,) = findings(BEHIND, one, whole(one))
    assert f"stands on the source side of {words}; at the pins" in found.message


def test_capacitors_on_both_sides_are_sound():
    """With one at the pins the other side does not matter."""
    one = rail(upstream=(capacitor("C5", behind="FB1"),))
    assert outcomes(BEHIND, one, whole(one)) == []


def test_behind_is_silent_for_bulk_or_unknown_values():
    """Only a capacitor of the size that decouples can stand on the wrong side."""
    bulk = rail(decoupling=(), upstream=(capacitor("C5", 10e-6, behind="FB1"),))
    assert outcomes(BEHIND, bulk, whole(bulk)) == []
    unknown = rail(decoupling=(), upstream=(capacitor("C5", None, behind="FB1"),))
    assert outcomes(BEHIND, unknown, whole(unknown)) == []


def test_rails_decoupled_only_to_each_other_make_one_finding():
    """Both rails are named in one minor finding, and none is called absent."""
    across = (capacitor("C3", to="-12V"),)
    plus = rail(decoupling=(), across=across)
    minus = rail("-12V", -12.0, decoupling=(), across=(capacitor("C3", to="+12V"),))
    both = whole(plus, minus)
    (found,) = findings(ACROSS, plus, both)
    assert (found.severity, found.nets) == ("minor", ("+12V", "-12V"))
    assert findings(ACROSS, minus, both) == []
    assert outcomes(ABSENT, plus, both) == []


def test_a_rail_whose_partner_has_its_own_stands_alone():
    """The negative rail has one to ground: only the other goes without."""
    plus = rail(decoupling=(), across=(capacitor("C3", to="-12V"),))
    minus = rail("-12V", -12.0, across=(capacitor("C3", to="+12V"),))
    both = whole(minus, plus)
    (found,) = findings(ACROSS, plus, both)
    assert found.nets == ("+12V",)
    assert found.message == ("Rail +12V of U1 is decoupled only by C3 to the other rail, not to 0.")
    assert findings(ACROSS, minus, both) == []


def test_across_is_silent_with_a_capacitor_to_the_return_or_on_a_bench():
    """One to ground makes the other a bonus."""
    one = rail(across=(capacitor("C3", to="-12V"),))
    assert outcomes(ACROSS, one, whole(one)) == []
    only = changed(one, decoupling=())
    assert outcomes(ACROSS, only, whole(only, kind="bench")) == []


def test_across_of_unknown_value_is_left_to_absent():
    """Without a value it is not known to decouple anything."""
    one = rail(decoupling=(), across=(capacitor("C3", None, to="-12V"),))
    assert outcomes(ACROSS, one, whole(one)) == []
    assert len(open_points(ABSENT, one, whole(one))) == 1


@pytest.mark.parametrize("rule", [ABSENT, FEW, BEHIND, ACROSS])
@pytest.mark.parametrize(
    "fields",
    [{"packages": ()}, {"net": "mid", "returns": ("mid",)}, {"net": "0", "returns": ("0",)}],
)
def test_a_return_and_a_rail_that_feeds_nothing_are_not_judged(rule, fields):
    """Whatever stands on them."""
    usual = {"decoupling": (), "packages": ("U1", "U2")}
    for capacitors in (
        {},
        {"upstream": (capacitor(behind="FB1"),)},
        {"across": (capacitor("C3", to="-12V"),)},
    ):
        one = rail(**{**usual, **capacitors, **fields})
        assert outcomes(rule, one, whole(one)) == []


@pytest.mark.parametrize(("returns", "to"), [(("0",), "0"), (("-12V", "0"), "-12V"), ((), "0")])
def test_a_capacitor_goes_to_the_rail_s_own_return(returns, to):
    """The opposite rail where no ground is used; ground where none is known."""
    one = rail(decoupling=(), returns=returns)
    (found,) = findings(ABSENT, one, whole(one))
    assert found.remedy == f"Fit 100 nF from +12V to {to} at U1."


def test_a_rail_with_nothing_on_it_says_no_more():
    """No other size stands there."""
    (found,) = findings(ABSENT, BARE, whole(BARE))
    assert found.message == (
        "Rail +12V feeds 1 package (U1) and has no capacitor of 10 nF to 1 µF to its return."
    )


@pytest.mark.parametrize(
    ("rails", "words"),
    [
        ((BARE,), "rail +12V (U1)"),
        ((BARE, rail("-12V", decoupling=())), "rails +12V and -12V (U1)"),
    ],
)
def test_what_is_said_of_a_bench(rails, words):
    """Which rails, whose, and why it may be right."""
    (found,) = findings(ABSENT, BARE, whole(*rails, kind="bench"))
    assert found.message == (
        f"No capacitor stands on {words}. The deck is read as a bench, where ideal sources need "
        "none; a board does."
    )
    assert (found.basis, found.location) == (("netlist", "practice"), BARE.location)
