"""Where the figures of the stage sheet came from, in words."""

from railguard.analysis.bound import Bound
from railguard.analysis.stage import Stage
from railguard.devices.model import Figure
from railguard.rules.wording import listed, origin
from railguard.units import si
from railguard.words import Basis


def bases(bounds: tuple[Bound, Bound], stage: Stage, part: str) -> dict[str, str]:
    """Say where each kind of figure of a quantity came from."""
    high, low = bounds
    culprits = listed(dict.fromkeys((*high.culprits[:2], *low.culprits[:2])))
    worst = "extreme values of tolerances, offset and bias"
    if culprits:
        worst += f", moved most by {culprits}"
    return {
        "demand_basis": why(stage, part) or both(high.demand_basis, low.demand_basis),
        "worst_basis": worst,
        "available_basis": both(high.typical_basis, low.typical_basis)
        if high.typical is not None or low.typical is not None
        else "",
        "guaranteed_basis": limit(high, low),
    }


def both(one: Basis, other: Basis) -> str:
    """Name the origin of both ends of a range, a common one once."""
    return " and ".join(dict.fromkeys((origin(one), origin(other))))


def limit(high: Bound, low: Bound) -> str:
    """Say where the guaranteed limits came from, and at which load or current they hold."""
    if high.guaranteed is None and low.guaranteed is None:
        return ""
    words = both(high.guaranteed_basis, low.guaranteed_basis)
    condition = high.condition or low.condition
    return f"{words}, {condition}" if condition and condition != words else words


def figure_basis(figure: Figure) -> str:
    """Say where a device's figure came from, or that none is listed."""
    return "not listed" if figure.best is None else origin(figure.best_basis)


def phase_basis(stage: Stage) -> str:
    """Say where the figures a phase margin rests on came from, and which of them are not listed."""
    device = stage.family
    if device is None:
        return ""
    figures = {
        "gain-bandwidth": device.gain_bandwidth,
        "output resistance": device.output_resistance,
        "input capacitance": device.input_capacitance,
    }
    known = [f"{name} {figure_basis(f)}" for name, f in figures.items() if f.best is not None]
    missing = [f"{name} not listed" for name, f in figures.items() if f.best is None]
    least = stage.loop.least_ohms
    taken = [] if least is None else [f"at least {si(least, 'Ω')} of output resistance taken"]
    return "; ".join([*known, *missing, *taken])


def why(stage: Stage, part: str) -> str:
    """Say why a part of a stage was not worked out, or ""."""
    return next((f"not worked out: {u.why}" for p, u in stage.unknown.items() if p == part), "")
