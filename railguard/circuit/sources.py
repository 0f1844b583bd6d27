"""What an independent source delivers over time."""

import msgspec


class Sine(msgspec.Struct, frozen=True, tag=True, gc=False):
    """SIN(offset amplitude frequency delay damping phase): V or A, hertz, seconds, 1/s, degrees."""

    offset: float
    amplitude: float
    frequency: float | None = None
    delay: float = 0.0
    damping: float = 0.0
    phase: float = 0.0


class Pulse(msgspec.Struct, frozen=True, tag=True, gc=False):
    """PULSE(first second delay rise fall width period): V or A, seconds; None where left out."""

    first: float
    second: float
    delay: float = 0.0
    rise: float | None = None
    fall: float | None = None
    width: float | None = None
    period: float | None = None


class Exponential(msgspec.Struct, frozen=True, tag=True, gc=False):
    """EXP(first second rise_delay rise_tau fall_delay fall_tau): V or A, seconds."""

    first: float
    second: float
    rise_delay: float = 0.0
    rise_tau: float | None = None
    fall_delay: float | None = None
    fall_tau: float | None = None


class Piecewise(msgspec.Struct, frozen=True, tag=True, gc=False):
    """PWL: (seconds, V or A) points in order; `repeat` the time it starts over from, or None."""

    points: tuple[tuple[float, float], ...]
    repeat: float | None = None
    delay: float = 0.0


class FrequencyModulated(msgspec.Struct, frozen=True, tag=True, gc=False):
    """SFFM(offset amplitude carrier index signal): V or A, hertz."""

    offset: float
    amplitude: float
    carrier: float | None = None
    index: float = 0.0
    signal: float | None = None


class AmplitudeModulated(msgspec.Struct, frozen=True, tag=True, gc=False):
    """AM(amplitude offset modulation carrier delay): the product of two sines, V or A, hertz."""

    amplitude: float
    offset: float
    modulation: float
    carrier: float
    delay: float = 0.0


Wave = Sine | Pulse | Exponential | Piecewise | FrequencyModulated | AmplitudeModulated


class Source(msgspec.Struct, frozen=True, gc=False):
    """A V or I source.

    dc       level for the operating point; None where the card states none (then the wave's
             value at time zero counts, and 0 where there is no wave)
    ac       (magnitude, degrees) of the small-signal probe: not an amplitude
    wave     its time function
    stated   False where the value could not be read
    """

    dc: float | None = None
    ac: tuple[float, float] | None = None
    wave: Wave | None = None
    stated: bool = True

    @property
    def level(self) -> float:
        """The operating-point level, volt or ampere."""
        if self.dc is not None:
            return self.dc
        match self.wave:
            case Sine() | FrequencyModulated():
                return self.wave.offset
            case Pulse() | Exponential():
                return self.wave.first
            case Piecewise() if self.wave.points:
                return self.wave.points[0][1]
            case _:
                return 0.0


def multiplied(source: Source, times: float) -> Source:
    """Return what several equal current sources in parallel deliver."""
    wave = source.wave
    match wave:
        case Sine() | FrequencyModulated():
            wave = msgspec.structs.replace(
                wave, offset=wave.offset * times, amplitude=wave.amplitude * times
            )
        case Pulse() | Exponential():
            wave = msgspec.structs.replace(
                wave, first=wave.first * times, second=wave.second * times
            )
        case Piecewise():
            points = tuple((moment, value * times) for moment, value in wave.points)
            wave = msgspec.structs.replace(wave, points=points)
        case AmplitudeModulated():
            wave = msgspec.structs.replace(wave, amplitude=wave.amplitude * times)
    dc = None if source.dc is None else source.dc * times
    ac = None if source.ac is None else (source.ac[0] * times, source.ac[1])
    return Source(dc, ac, wave, source.stated)
