"""Whether packages are supplied, the right way round, and on one pair of rails."""

import pytest

from railguard.analysis.rail import Rail
from railguard.analysis.stage import Unknown
from railguard.circuit.model import Element
from railguard.location import Location
from railguard.rules.supply.presence import MISSING, REVERSED, SPLIT
from tests.rules.stages import (
    SUPPLY,
    changed,
    design,
    findings,
    open_points,
    package,
    rail,
    resistor,
    single,
    stage,
)


def supplied(positive, negative, **fields):
    """Make a stage on two levels."""
    return stage(supply=changed(SUPPLY, positive=positive, negative=negative, **fields))


def unfed(net="vp", feed="nothing", **fields):
    """Make a rail that no level is known of."""
    return rail(net, None, feed=feed, **fields)


def test_a_supplied_package_is_quiet():
    """Twelve volts on both pins draw nothing."""
    whole = design(stage())
    assert findings(MISSING, whole.packages[0], whole) == []
    assert open_points(MISSING, whole.packages[0], whole) == []


def test_a_rail_nothing_feeds_is_missing_once_for_all_its_packages():
    """One dead net is one finding that names every package on it."""
    stages = [
        stage(
            name,
            supply=changed(SUPPLY, positive=None, positive_net="vp"),
            location=Location("station.cir", line),
        )
        for name, line in (("XU1", 12), ("XU2", 13))
    ]
    packages = tuple(package(s.package, channels=(s.designator,), positive=("vp",)) for s in stages)
    whole = design(*stages, rails=(unfed(packages=("U1", "U2")),), packages=packages)
    first, second = (findings(MISSING, p, whole) for p in packages)
    (found,) = first
    assert second == []
    assert found.severity == "critical"
    assert found.designators == ("XU1", "XU2")
    assert found.nets == ("vp",)
    assert found.message.startswith("Nothing feeds net vp: it is the positive supply pins of U1")
    assert found.location == Location("station.cir", 3)
    nowhere = changed(whole, rails=(unfed(packages=("U1", "U2"), location=None),))
    (found,) = findings(MISSING, packages[0], nowhere)
    assert found.location == stages[0].location == Location("station.cir", 12)


def test_a_rail_that_leaves_the_sheet_is_not_checked():
    """A supply net at a connector is open, with what to state."""
    one = stage(supply=changed(SUPPLY, positive=None, positive_net="VBAT"))
    whole = design(one, rails=(unfed("VBAT", "outside"),))
    assert findings(MISSING, whole.packages[0], whole) == []
    (point,) = open_points(MISSING, whole.packages[0], whole)
    assert '[nets] "VBAT" = { volts = ... }' in point.add


def test_a_deck_without_sources_states_no_supplies():
    """Where a netlist holds no source at all, a rail without one is not checked."""
    one = stage(supply=changed(SUPPLY, positive=None, positive_net="vp"))
    whole = design(one, rails=(unfed(),), elements=(resistor("R1", 1e3, "a", "b"),))
    assert findings(MISSING, whole.packages[0], whole) == []
    assert len(open_points(MISSING, whole.packages[0], whole)) == 1


def test_both_pins_on_one_net():
    """A package whose pins share a net has no supply."""
    one = supplied(5.0, 5.0, positive_net="vcc", negative_net="vcc")
    whole = design(one)
    (found,) = findings(MISSING, whole.packages[0], whole)
    assert "on net vcc" in found.message


def test_no_volts_between_the_pins():
    """A rail at zero is no supply; a tenth of a volt more is another rule's matter."""
    whole = design(supplied(0.05, 0.0))
    assert len(findings(MISSING, whole.packages[0], whole)) == 1
    borderline = design(supplied(0.2, 0.0))
    assert findings(MISSING, borderline.packages[0], borderline) == []
    stated = design(supplied(0.05, 0.0, basis="user"))
    (found,) = findings(MISSING, stated.packages[0], stated)
    assert found.basis == ("user",)


def test_a_symbol_without_supply_pins_is_not_checked():
    """An amplifier without supply pins is listed."""
    one = stage(supply=changed(SUPPLY, positive=None, negative=None, positive_net="",
                               negative_net="", pins=False),
                unknown={"supply": Unknown("no supply pins", "a card with them")})  # fmt: skip
    whole = design(one, rails=())
    (point,) = open_points(MISSING, whole.packages[0], whole)
    assert point.why == "no supply pins"


def test_pins_the_right_way_round_are_quiet():
    """A positive total draws nothing, on split and on single supplies."""
    for one in (stage(), stage(supply=single())):
        whole = design(one)
        assert findings(REVERSED, whole.packages[0], whole) == []


def test_swapped_pins():
    """A positive pin below the negative one is critical and names both nets."""
    whole = design(supplied(-12.0, 12.0, positive_net="-12V", negative_net="+12V"))
    (found,) = findings(REVERSED, whole.packages[0], whole)
    assert found.severity == "critical"
    assert found.nets == ("-12V", "+12V")
    assert "at -12 V, below the negative one (net +12V) at 12 V" in found.message


def test_one_rail_of_the_wrong_sign():
    """A reversed source leaves both pins at one level: the wrong rail is named."""
    whole = design(supplied(-12.0, -12.0))
    (found,) = findings(REVERSED, whole.packages[0], whole)
    assert "net +12V has the wrong sign" in found.message
    assert found.remedy == "Turn the source that feeds +12V."
    assert findings(MISSING, whole.packages[0], whole) == []


def test_a_single_supply_of_the_wrong_sign():
    """The negative pin stands at ground, as it should."""
    whole = design(supplied(-5.0, 0.0))
    (found,) = findings(REVERSED, whole.packages[0], whole)
    assert "(net +12V) is at -5 V, below the negative one (net -12V) at 0 V" in found.message


def test_a_reversed_channel_behind_one_of_unknown_supply():
    """Each is told: the one as not checked, the other as a fault."""
    pair = (
        stage("XU1A", package="U1", supply=changed(SUPPLY, positive=None, positive_net="VX")),
        stage("XU1B", package="U1", supply=changed(SUPPLY, positive=-12.0, negative=12.0)),
    )
    twin = package(channels=("XU1A", "XU1B"), positive=("VX", "+12V"))
    whole = design(*pair, packages=(twin,))
    (found,) = findings(REVERSED, twin, whole)
    assert found.designators == ("XU1B",)
    assert len(open_points(REVERSED, twin, whole)) == 1


def test_a_dead_supply_is_not_called_reversed():
    """No volts at all are missing, not reversed."""
    whole = design(supplied(0.0, 0.0))
    assert findings(REVERSED, whole.packages[0], whole) == []


def test_packages_on_the_same_reversed_rails_make_one_finding():
    """A reversed source is one cause for all packages on it."""
    flipped = changed(SUPPLY, positive=-12.0, negative=12.0)
    whole = design(stage("XU1", supply=flipped), stage("XU2", supply=flipped))
    counts = [len(findings(REVERSED, p, whole)) for p in whole.packages]
    assert counts == [1, 0]


def test_an_unknown_level_is_not_checked_for_its_sign():
    """A supply nobody states cannot be judged."""
    whole = design(supplied(None, -12.0))
    assert findings(REVERSED, whole.packages[0], whole) == []
    assert len(open_points(REVERSED, whole.packages[0], whole)) == 1


def test_channels_on_two_rails():
    """One supply pin cannot stand on two nets."""
    twin = package(channels=("XU1A", "XU1B"), positive=("+12V", "+5V"))
    (found,) = findings(SPLIT, twin)
    assert found.severity == "major"
    assert found.nets == ("+12V", "+5V")


def test_a_channel_with_swapped_pins_in_a_sound_package():
    """Each pair of nets is judged: the second channel's fault is not hidden by the first."""
    flipped = changed(SUPPLY, positive=-12.0, negative=12.0, positive_net="-12V",
                      negative_net="+12V")  # fmt: skip
    pair = (stage("XU1A", package="U1"), stage("XU1B", package="U1", supply=flipped))
    twin = package(channels=("XU1A", "XU1B"), positive=("+12V", "-12V"), negative=("-12V", "+12V"))
    whole = design(*pair, packages=(twin,))
    (found,) = findings(REVERSED, twin, whole)
    assert found.designators == ("XU1B",)
    assert found.message.startswith("U1: the positive supply pin (net -12V) is at -12 V")
    (split,) = findings(SPLIT, twin, whole)
    assert "its positive supply pin on nets +12V and -12V" in split.message


def test_channels_on_one_rail_are_quiet():
    """The same net twice is one rail, and an unknown one is no second."""
    assert findings(SPLIT, package(positive=("+12V", "+12V"))) == []
    assert findings(SPLIT, package(positive=("+12V", ""))) == []


def test_rails_know_ground_as_no_rail():
    """A negative pin at ground has no rail of its own and draws nothing."""
    assert isinstance(rail(), Rail)
    whole = design(stage(supply=single()), rails=(rail("+5V", 5.0),))
    assert findings(MISSING, whole.packages[0], whole) == []


def test_a_deck_of_batteries_states_its_supplies():
    """A rail that none of them feeds is missing, as with sources."""
    one = stage(supply=changed(SUPPLY, positive=None, positive_net="vp"))
    cell = Element(kind="battery", designator="BT1", nets=("vbat", "0"))
    whole = design(one, rails=(unfed(),), elements=(cell,))
    assert len(findings(MISSING, whole.packages[0], whole)) == 1


@pytest.mark.parametrize(("positive", "negative"), [(12.0, 12.0), (0.5, 0.5)])
def test_a_negative_rail_of_the_wrong_sign(positive, negative):
    """Both pins stand above ground: the lower one is wrong."""
    whole = design(supplied(positive, negative))
    (found,) = findings(REVERSED, whole.packages[0], whole)
    assert "net -12V has the wrong sign" in found.message
    assert found.remedy == "Turn the source that feeds -12V."
    assert (found.demand, found.limit, found.margin) == (0.0, 0.1, -0.1)


def test_channels_on_two_negative_rails():
    """The pin is named."""
    twin = package(channels=("XU1A", "XU1B"), negative=("-12V", "0"))
    (found,) = findings(SPLIT, twin)
    assert "its negative supply pin on nets -12V and 0" in found.message


@pytest.mark.parametrize("pin", ["positive", "negative"])
def test_a_pin_that_nothing_feeds_is_named(pin):
    """With its package, whatever its channel is called."""
    supply = changed(SUPPLY, **{pin: None, f"{pin}_net": "vx"})
    one = stage("XU1A", package="U1", supply=supply)
    whole = design(one, rails=(unfed("vx"),), packages=(package(channels=("XU1A",)),))
    (found,) = findings(MISSING, whole.packages[0], whole)
    assert found.message == (
        f"Nothing feeds net vx: it is the {pin} supply pin of U1, and no source, regulator or "
        "connector stands on it."
    )
