"""Whether a device's figures meet what a finding says is missing, before it is tried in place.

Coarse on purpose: a device that passes here is put into the design and reviewed, and that decides.
"""

from collections.abc import Callable, Iterator, Mapping

from railguard.analysis.available import current_reach, input_reach, output_reach
from railguard.analysis.stage import Stage
from railguard.devices.model import Device
from railguard.devices.model import Figure as Listed
from railguard.redline.model import Figure
from railguard.rules.finding import Finding
from railguard.units import si

Check = Callable[[Finding, Stage, Device], Iterator[tuple[Figure, bool]]]
"""Yield each figure that decides, and whether it does."""


def output(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the swing at the demanded current with the demanded range."""
    supply, demand = stage.supply, stage.output.demand
    if supply.positive is None or supply.negative is None:
        return
    for upper in (True, False):
        asked = demand.high if upper else demand.low
        amps = stage.current.demand_source if upper else stage.current.demand_sink
        if asked is None:
            continue
        reach = output_reach(device, supply.positive, supply.negative, upper, _always(amps or 0.0))
        best = reach.best
        if best is None:
            return
        end = "up to" if upper else "down to"
        yield (
            Figure(f"output {end}", si(asked, "V"), si(best, "V")),
            best >= asked if upper else best <= asked,
        )


def _always(amps: float) -> Callable[[float], float]:
    return lambda _level: amps


def inputs(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the common-mode range with what the inputs cover."""
    supply, demand = stage.supply, stage.inputs.demand
    if supply.positive is None or supply.negative is None:
        return
    for upper in (True, False):
        asked = demand.high if upper else demand.low
        reach = input_reach(device, supply.positive, supply.negative, upper)
        best = reach.best
        if asked is None or best is None:
            continue
        end = "up to" if upper else "down to"
        yield (
            Figure(f"inputs {end}", si(asked, "V"), si(best, "V")),
            best >= asked if upper else best <= asked,
        )


def current(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the output current with what is asked for."""
    for source in (True, False):
        asked = stage.current.demand_source if source else stage.current.demand_sink
        reach = current_reach(device, source)
        best = reach.best
        if not asked or best is None:
            continue
        word = "current sourced" if source else "current sunk"
        yield Figure(word, si(asked, "A"), si(best, "A")), best >= asked


def supply(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the total supply with the recommended range."""
    total, low, high = stage.supply.total, device.supply_low, device.supply_high
    if total is None or low is None or high is None:
        return
    given = f"{si(low, 'V')} to {si(high, 'V')}"
    yield Figure("total supply", si(total, "V"), given), low <= total <= high


def _least(name: str, words: str, unit: str, share: float = 1.0) -> Check:
    """Make a check of a figure that must be at least what the finding asks for."""

    def check(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
        value = getattr(device, name).best
        asked = share * (finding.demand or 0.0)
        if value is not None and asked:
            yield Figure(words, si(asked, unit), si(value, unit)), value >= asked

    return check


def loop_gain(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the gain-bandwidth product with noise gain, band and the loop gain wanted."""
    value, loop = device.gain_bandwidth.best, stage.loop
    if value is not None and loop.noise_gain and loop.band and finding.demand:
        asked = loop.noise_gain * loop.band * finding.demand
        yield Figure("gain-bandwidth", si(asked, "Hz"), si(value, "Hz")), value >= asked


def bias(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the bias current with what the error allows."""
    return _in_proportion("bias current", "A", finding, stage, device, lambda d: d.bias_current)


def offset(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the offset voltage with what the range allows."""
    return _in_proportion("offset", "V", finding, stage, device, lambda d: d.offset_voltage)


def _in_proportion(
    name: str,
    unit: str,
    finding: Finding,
    stage: Stage,
    device: Device,
    listed: Callable[[Device], Listed],
) -> Iterator[tuple[Figure, bool]]:
    """Compare a figure that makes an error with what the error may be, from what it makes now."""
    value = listed(device).best
    present = listed(stage.family).best if stage.family is not None else None
    if value is None or not present or not finding.demand or not finding.limit:
        return
    asked = present * finding.limit / finding.demand
    yield Figure(name, f"at most {si(asked, unit)}", si(value, unit)), value <= asked


def stable(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the least stable gain with the noise gain where the loop closes."""
    value, closes = device.stable_gain.best, stage.loop.noise_gain_crossover
    if value is not None and closes:
        yield Figure("stable from", si(closes, ""), si(value, "")), value <= closes * 1.05


def load(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare the capacitive load with what the device stands."""
    value, farads = device.load_capacitance.best, stage.current.load_capacitance
    gain = max(stage.loop.noise_gain_crossover or 1.0, 1.0)
    if value is not None and farads:
        yield (
            Figure("capacitive load", si(farads, "F"), si(value * gain, "F")),
            (value * gain >= farads),
        )


def no_reversal(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Ask for a device that keeps its sense beyond its input range."""
    if device.phase_reversal is not None:
        given = "turns over" if device.phase_reversal else "keeps its sense"
        yield Figure("beyond its input range", "keeps its sense", given), not device.phase_reversal


def heat(finding: Finding, stage: Stage, device: Device) -> Iterator[tuple[Figure, bool]]:
    """Compare thermal resistance; the review with the device in place decides."""
    best = min(device.theta.values(), default=None)
    if best is not None:
        yield Figure("junction to ambient", "", si(best, "K/W")), True


CHECKS: Mapping[str, Check] = {
    "headroom-output": output,
    "headroom-input": inputs,
    "headroom-stuck": output,
    "headroom-phase-reversal": no_reversal,
    "headroom-offset": offset,
    "headroom-differential": _least("differential_input", "differential input", "V"),
    "drive-current": current,
    "drive-power": heat,
    "supply-range": supply,
    "bias-current-error": bias,
    "feedback-high": bias,
    "dynamics-loop-gain": loop_gain,
    "dynamics-slew": _least("slew_rate", "slew rate", "V/s", 1.5),
    "dynamics-filter": _least("gain_bandwidth", "gain-bandwidth", "Hz"),
    "stability-noise-gain": stable,
    "stability-load-capacitance": load,
}
"""By rule: the figures of a device that decide."""
