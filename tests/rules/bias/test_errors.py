"""The level of AC-coupled stages, and what bias current makes of source resistance."""

import pytest

from railguard.analysis.bound import Range
from railguard.analysis.loop import Loop
from railguard.analysis.stage import Output
from railguard.rules.bias.errors import CURRENT_ERROR, LEVEL
from railguard.settings.model import Settings
from tests.rules.stages import (
    FAMILY,
    changed,
    design,
    figure,
    findings,
    inputs,
    outcomes,
    pin,
    stage,
    unknown_device,
)


def coupled(level, demand=None, **fields):
    """Make an AC-coupled stage that rests at a level of a range from 0 to 5 V."""
    output = Output(
        net="out",
        level=level,
        available=Range(0.0, 5.0),
        demand=Range() if demand is None else Range(level - demand, level + demand),
    )
    return stage(output=output, **{"ac_coupled": True, **fields})


@pytest.mark.parametrize("level", [2.5, 0.5, 4.5])
def test_a_level_with_room_is_quiet(level):
    """A tenth of the range on either side is enough."""
    assert outcomes(LEVEL, coupled(level)) == []


def test_a_level_near_its_end_is_minor():
    """The sentence says what clips, the remedy where to bias."""
    (found,) = findings(LEVEL, coupled(0.3))
    assert found.severity == "minor"
    assert "clips a signal of more than 300 mV peak" in found.message
    assert found.remedy == "Bias it so that its output rests at 2.5 V."


def test_a_signal_that_fits_is_no_trouble():
    """A level near the end is enough for a small signal."""
    assert outcomes(LEVEL, coupled(0.3, demand=0.2)) == []
    assert len(findings(LEVEL, coupled(0.3, demand=0.4))) == 1


def test_level_is_silent_where_it_makes_no_sense():
    """DC-coupled stages, levels beyond the range or unknown, and broken loops are not judged."""
    assert outcomes(LEVEL, coupled(0.3, ac_coupled=False)) == []
    assert outcomes(LEVEL, coupled(-0.1)) == []
    assert outcomes(LEVEL, coupled(None)) == []
    assert outcomes(LEVEL, coupled(0.3, loop=Loop(dc="open"))) == []


def fed_through(ohms, minus=0.0, amps=0.5e-6, **fields):
    """Make a bipolar stage with a resistance at its non-inverting input; its gain is 11."""
    family = changed(
        FAMILY,
        technology="bipolar",
        bias_current=figure(guaranteed=amps),
        offset_voltage=figure(guaranteed=1e-3),
    )
    return stage(
        family=family,
        output=changed(stage().output, demand=Range(-5.0, 5.0)),
        inputs=inputs(
            plus=pin("in", resistance=ohms, path=("R7",)), minus=pin("n", resistance=minus)
        ),
        **fields,
    )


def test_a_low_resistance_is_quiet():
    """18 kΩ times 0.5 µA times 11 is 99 mV, within 1 % of 10 V."""
    assert outcomes(CURRENT_ERROR, fed_through(18e3)) == []


@pytest.mark.parametrize(("ohms", "severity"), [(18.4e3, "minor"), (200e3, "critical")])
def test_bias_current_through_a_high_resistance(ohms, severity):
    """Just beyond 1 % minor, beyond 10 % like a typical limit."""
    (found,) = findings(CURRENT_ERROR, fed_through(ohms))
    assert found.severity == severity
    assert found.demand == pytest.approx(0.5e-6 * ohms * 11)


def test_the_remedy_is_a_resistance_that_would_do():
    """200 kΩ are 1.1 V, 18.2 kΩ would be 100 mV: 18 kΩ is the next below that is made."""
    (found,) = findings(CURRENT_ERROR, fed_through(200e3))
    assert "down to 18 kΩ" in found.remedy


def test_less_than_ten_kilohms_count_only_where_the_error_is_large():
    """A small resistance is the device's matter, unless a tenth of the span is lost."""
    assert findings(CURRENT_ERROR, fed_through(9e3, amps=5e-6)) == []
    assert len(findings(CURRENT_ERROR, fed_through(9e3, amps=20e-6))) == 1


def test_an_ac_coupled_stage_is_measured_against_its_range():
    """A level that is off costs an AC signal range only: 121 mV of 21 V are nothing."""
    one = fed_through(22e3)
    assert len(findings(CURRENT_ERROR, one)) == 1
    output = changed(one.output, available=Range(-10.5, 10.5))
    assert findings(CURRENT_ERROR, changed(one, ac_coupled=True, output=output)) == []


def test_an_equal_resistance_at_the_other_input_undoes_it():
    """Matched resistances leave only the offset current."""
    assert outcomes(CURRENT_ERROR, fed_through(100e3, minus=100e3)) == []


def test_an_error_below_the_devices_offset_is_not_told():
    """What the offset hides is no trouble."""
    one = fed_through(18.4e3)
    hidden = changed(one, family=changed(one.family, offset_voltage=figure(guaranteed=20e-3)))
    assert outcomes(CURRENT_ERROR, hidden) == []


def test_fet_inputs_double_every_ten_degrees():
    """At 85 °C a FET's bias current is 64 times that at 25 °C."""
    cold = fed_through(18e3, amps=0.5e-6 / 32)
    fet = changed(cold, family=changed(cold.family, technology="jfet"))
    assert outcomes(CURRENT_ERROR, fet) == []
    warm = design(fet, settings=Settings(ambient=(0.0, 85.0)))
    (found,) = findings(CURRENT_ERROR, fet, warm)
    assert "carried to 85 °C" in found.message


def test_an_unlisted_bias_current_is_not_judged():
    """Without the figure, without a device, or in a broken loop nothing is claimed."""
    one = fed_through(100e3)
    assert outcomes(CURRENT_ERROR, changed(one, family=FAMILY_WITHOUT)) == []
    assert outcomes(CURRENT_ERROR, unknown_device()) == []
    assert outcomes(CURRENT_ERROR, changed(one, loop=Loop(dc="positive"))) == []


FAMILY_WITHOUT = changed(FAMILY, bias_current=figure())
