"""What an independent source delivers, as the text ngspice reads.

Only numbers reach the text. In ngspice a zero for a time that a card leaves out means its default
(the printed step or the end of the run), so a time that is not known is written as zero.
"""

from railguard.circuit.sources import (
    AmplitudeModulated,
    Exponential,
    FrequencyModulated,
    Piecewise,
    Pulse,
    Sine,
    Source,
    Wave,
)


def number(value: float) -> str:
    """Return a number as it stands in a deck."""
    return f"{value:.9g}"


def source_text(source: Source) -> str:
    """Return the level, the small-signal probe and the time function of a source."""
    parts = [f"DC {number(source.level)}"]
    if source.ac is not None:
        parts.append(f"AC {number(source.ac[0])} {number(source.ac[1])}")
    if source.wave is not None:
        parts.append(_wave(source.wave))
    return " ".join(parts)


def _call(name: str, *values: float | None) -> str:
    return f"{name}({' '.join(number(value or 0.0) for value in values)})"


def _wave(wave: Wave) -> str:
    match wave:
        case Sine():
            phase = wave.phase
            values = (wave.offset, wave.amplitude, wave.frequency, wave.delay, wave.damping, phase)
            return _call("SIN", *values)
        case Pulse():
            edges = (wave.delay, wave.rise, wave.fall, wave.width, wave.period)
            return _call("PULSE", wave.first, wave.second, *edges)
        case Exponential():
            fall = wave.rise_delay if wave.fall_delay is None else wave.fall_delay
            times = (wave.rise_delay, wave.rise_tau, fall, wave.fall_tau)
            return _call("EXP", wave.first, wave.second, *times)
        case FrequencyModulated():
            tone = (wave.carrier, wave.index, wave.signal)
            return _call("SFFM", wave.offset, wave.amplitude, *tone)
        case AmplitudeModulated():
            tones = (wave.modulation, wave.carrier, wave.delay)
            return _call("AM", wave.amplitude, wave.offset, *tones)
        case Piecewise():
            return _piecewise(wave)


def _piecewise(wave: Piecewise) -> str:
    """Write a PWL with its delay worked into the points: `td` is not read by every version."""
    points = [(time + wave.delay, value) for time, value in wave.points]
    text = _call("PWL", *(part for point in points for part in point))
    if wave.repeat is None:
        return text
    return f"{text} r={number(wave.repeat + wave.delay)}"
