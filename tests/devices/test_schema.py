"""What no op-amp can be is refused, and the whole catalogue passes."""

import msgspec
import pytest

from railguard.devices.catalogue import load, read_family_file
from railguard.devices.index import build, family_files
from railguard.devices.layout import SourceTable, read_table
from railguard.devices.model import Device, Figure, SwingPoint
from railguard.devices.schema import faults, shared_names, table_faults

SOUND = Device(
    family="GAUGE",
    supply_low=4.0,
    supply_high=30.0,
    supply_absolute=36.0,
    swing_high=(SwingPoint(1e-3, 1.0, 1.5, 30.0),),
    swing_low=(SwingPoint(1e-3, 1.0, 1.5, 30.0),),
    input_low=Figure(1.0, 2.0),
    input_high=Figure(-1.0, -2.0),
    gain_bandwidth=Figure(3e6, 2e6),
    slew_rate=Figure(13e6, 8e6),
    offset_voltage=Figure(3e-3, 10e-3, 13e-3),
)


@pytest.mark.parametrize("path", family_files(), ids=lambda path: path.stem)
def test_every_shipped_family_is_possible(path):
    """Every shipped family is possible."""
    table = read_family_file(path)
    assert table_faults(table) == ()
    assert faults(load().device(table.family)) == ()


def test_at_least_140_families_pass():
    """At least 140 families pass."""
    assert len(family_files()) >= 140


def test_no_two_families_claim_one_order_code():
    """Nor does a family of the catalogue stand among the op-amps known by name only."""
    tables = [read_family_file(path) for path in family_files()]
    assert shared_names(tables) == ()
    index = build()
    owned = {
        base
        for entry in index.families.values()
        for names in entry.names.values()
        for base in names
    }
    named = [name for names in index.named_only.values() for name in names]
    assert len(named) == len(set(named))
    assert owned.isdisjoint(named)


def test_the_sound_device_has_no_fault():
    """The sound device has no fault."""
    assert faults(SOUND) == ()


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"supply_low": 30.0}, "its lowest supply, 30 V, is not below its highest, 30 V"),
        (
            {"supply_absolute": 28.0},
            "its highest supply, 30 V, is above its absolute maximum",
        ),
        ({"supply_low": 0.003}, "its lowest supply is 0.003 V"),
        ({"gain_bandwidth": Figure(3.0)}, "gain bandwidth of 3 Hz is outside"),
        ({"slew_rate": Figure(13.0)}, "slew rate of 13 V/s is outside"),
        ({"voltage_noise": Figure(18.0)}, "voltage noise of 18 V/√Hz is outside"),
        ({"bias_current": Figure(65.0)}, "bias current of 65 A is outside"),
        ({"offset_voltage": Figure(3.0)}, "offset voltage of 3 V is outside"),
        ({"source_current": Figure(30.0)}, "source current of 30 A is outside"),
        ({"supply_current": Figure(1.4)}, "supply current of 1.4 A is outside"),
        ({"load_capacitance": Figure(100.0)}, "load capacitance of 100 F is outside"),
        ({"stable_gain": Figure(0.1)}, "stable gain of 0.1 V/V is outside"),
        ({"open_loop_gain": Figure(106.0)}, "open loop gain of 106 V/V is outside"),
        (
            {"slew_rate": Figure(3e3)},
            "3000 V/s and bandwidth 2e+06 Hz do not go together",
        ),
        ({"gain_bandwidth": Figure(3e6, 4e6)}, "gain bandwidth: the guaranteed value is better"),
        ({"offset_voltage": Figure(3e-3, 2e-3)}, "offset voltage: the guaranteed value is better"),
        ({"offset_voltage": Figure(None, 3e-3, 2e-3)}, "offset voltage: the guaranteed value is"),
        ({"input_low": Figure(3.0, 2.0)}, "input low: the guaranteed value is better"),
        ({"input_high": Figure(-3.0, -2.0)}, "input high: the guaranteed value is better"),
        ({"swing_high": (SwingPoint(1e-3, 31.0, None, 30.0),)}, "is 31 V, outside its supply"),
        ({"swing_high": (SwingPoint(1e-3, 12.0, None, 5.0),)}, "is 12 V, outside its supply"),
        ({"swing_low": (SwingPoint(1e-3, -0.1, None, 30.0),)}, "is -0.1 V, outside its supply"),
        (
            {"swing_low": (SwingPoint(1e-3, 1.0, 0.5, 30.0),)},
            "rail at 0.001 A: the guaranteed value",
        ),
        (
            {"swing_low": (SwingPoint(1e-3),)},
            "to the negative rail at 0.001 A has no value",
        ),
        ({"swing_low": (SwingPoint(40.0, 1.0),)}, "that current is outside what an op-amp gives"),
        ({"swing_low": (SwingPoint(1e-3, 1.0, None, 44.0),)}, "listed at 44 V, above the absolute"),
        ({"temperature": (70.0, 0.0)}, "its temperature range is 70 to 0 °C"),
        ({"theta": {"SOIC-8": 0.1}}, "a thermal resistance of 0.1 K/W for SOIC-8"),
        ({"supply_high": 5.0, "input_low": Figure(None, 4.0)}, "no input level is legal"),
    ],
)
def test_impossible_figures_are_refused(change, words):
    """Impossible figures are refused."""
    found = faults(msgspec.structs.replace(SOUND, **change))
    assert any(words in fault for fault in found), found


def test_nothing_left_between_the_output_limits_is_refused():
    """Nothing left between the output limits is refused."""
    wide = (SwingPoint(1e-3, 14.0, 16.0, 30.0),)
    found = faults(msgspec.structs.replace(SOUND, swing_high=wide, swing_low=wide))
    assert "on 30 V nothing is left between its output limits" in found


def test_an_unlimited_capacitive_load_is_a_figure():
    """An unlimited capacitive load is a figure."""
    assert faults(msgspec.structs.replace(SOUND, load_capacitance=Figure(float("inf")))) == ()


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"source": None}, "no data sheet with title and publisher is named"),
        ({"source": SourceTable(title="Sheet")}, "no data sheet with title and publisher is named"),
        ({"names": {}}, "no order code leads to it"),
        ({"names": {1: ("tl072",)}}, "the name tl072 is no order code"),
        ({"names": {1: ("TL07.",)}}, "the name TL07. is no order code"),
        ({"conditions": ""}, "the conditions of its figures are not said"),
    ],
)
def test_a_shipped_table_must_name_its_sheet_its_codes_and_its_conditions(change, words):
    """A shipped table must name its sheet its codes and its conditions."""
    table = msgspec.structs.replace(read_family_file(family_files()[0]), **change)
    assert words in table_faults(table)


def test_an_order_code_of_two_families_is_found():
    """An order code of two families is found."""
    one = read_table({"family": "A", "names": {"2": ["TL07[12]"]}})
    two = read_table({"family": "B", "names": {"1": ["TL071"]}})
    assert shared_names([one, two]) == (
        "TL071 leads to A with 2 channels and to B with 1 channels",
    )
