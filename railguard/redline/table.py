"""Which changes are tried for which rule, in order; the first that is proved is proposed."""

from collections.abc import Callable, Iterator, Mapping

from railguard.redline import (
    attenuation,
    bias,
    centre,
    compensation,
    coupling,
    decoupling,
    gain,
    isolation,
    layout,
    network,
    pins,
    resistance,
    values,
)
from railguard.redline.scene import Candidate, Scene
from railguard.rules.finding import Finding

Cure = Callable[[Finding, Scene], Iterator[Candidate]]

CURES: Mapping[str, tuple[Cure, ...]] = {
    "decoupling-absent": (decoupling.one_a_package,),
    "decoupling-few": (decoupling.missing,),
    "decoupling-behind-series": (decoupling.one_a_package,),
    "decoupling-rail-to-rail-only": (decoupling.one_a_package,),
    "decoupling-bulk": (decoupling.bulk,),
    "decoupling-fast": (decoupling.small,),
    "decoupling-reference": (decoupling.reference,),
    "decoupling-rating": (decoupling.rating,),
    "bias-no-dc-path": (bias.returned,),
    "bias-level": (centre.centred,),
    "bias-current-error": (resistance.lowered, resistance.balanced),
    "bias-unused": (bias.parked,),
    "headroom-output": (
        pins.less_drop,
        gain.level_blocked,
        centre.level_outside,
        attenuation.divided_entry,
        gain.fitted,
        centre.centred,
        attenuation.divided_input,
    ),
    "headroom-input": (
        centre.centred,
        attenuation.divided_entry,
        gain.fitted,
        attenuation.divided_input,
    ),
    "headroom-phase-reversal": (
        attenuation.divided_entry,
        gain.fitted,
        attenuation.divided_input,
    ),
    "headroom-stuck": (centre.centred, gain.fitted),
    "headroom-offset": (gain.blocked, gain.fitted),
    "headroom-load": (gain.fitted, isolation.divided),
    "feedback-low": (network.scaled,),
    "feedback-high": (network.scaled, compensation.across_feedback_resistor),
    "feedback-open": (bias.across,),
    "feedback-reversed": (pins.swapped_inputs,),
    "feedback-current-type": (compensation.current_type,),
    "drive-current": (network.scaled, isolation.isolated, gain.fitted),
    "drive-capacitive": (isolation.isolated,),
    "drive-input-above-rail": (isolation.guarded,),
    "dynamics-coupling": (coupling.enlarged,),
    "stability-phase-margin": (compensation.phase,),
    "stability-load-capacitance": (isolation.isolated,),
    "stability-transimpedance": (compensation.across_feedback_resistor,),
    "stability-noise-gain": (compensation.lead,),
    "supply-reversed": (pins.swapped_supply, pins.turned_source),
    "supply-missing": (pins.fed,),
    "supply-drop": (pins.smaller_series,),
    "netlist-value-suffix": (values.respelled,),
    "netlist-value-form": (values.respelled,),
    "netlist-value-second-number": (values.commented,),
    "netlist-value-series": (values.in_series,),
    "netlist-value-sign": (values.made_positive,),
    "netlist-shorted": (layout.taken_out,),
    "netlist-title": (layout.titled,),
    "netlist-end": (layout.before_end,),
    "netlist-duplicate": (layout.renamed,),
    "netlist-continuation": (layout.uncontinued,),
}
"""By rule. A rule that is not here asks for what no card holds: another device, another rail, a
statement of the user's."""


def candidates(finding: Finding, scene: Scene) -> Iterator[Candidate]:
    """Yield what may cure a finding, the likeliest first."""
    for cure in CURES.get(finding.rule, ()):
        scene.forget()
        yield from cure(finding, scene)
