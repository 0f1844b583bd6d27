"""Which finding can be the cause of which, and by what two of them are seen to belong together."""

from collections.abc import Callable

import msgspec

from railguard.analysis.stage import Design
from railguard.rules.finding import Finding
from railguard.rules.relations import (
    by_bias_current,
    dead_before,
    graver,
    heavy_load,
    heavy_network,
    made_by_offset,
    makes_no_offset,
    network_alone,
    no_linear_loop,
    on_the_tied_net,
    one_load,
    one_rail,
    one_reference,
    only_at_a_corner,
    only_unclipped,
    rests_on_value,
    same_side,
    saturated_before,
    shared_designator,
    shared_supply,
    switching,
    too_low_a_supply,
    touches,
)

Related = Callable[[Finding, Finding, Design], str]
"""related(cause, finding, design): the designator or net they have in common, or ""."""


class Link(msgspec.Struct, frozen=True):
    """Which rules' findings can follow from which, and how two findings are seen to belong.

    follows  names of rules, or of whole families
    """

    causes: tuple[str, ...]
    follows: tuple[str, ...]
    related: Related


_RUNNING = (
    "headroom",
    "drive-current",
    "drive-power",
    "drive-capacitive",
    "drive-input-above-rail",
    "dynamics",
    "stability",
    "bias-level",
    "bias-current-error",
    "feedback-low",
    "feedback-high",
)
"""What has a meaning only for a stage that works."""

_VALUES = tuple(
    f"netlist-value-{kind}" for kind in ("suffix", "second-number", "form", "missing", "sign")
)

LINKS: tuple[Link, ...] = (
    Link(
        _VALUES,
        ("supply", "decoupling", "headroom", "drive", "bias", "feedback", "dynamics", "stability"),
        rests_on_value,
    ),
    Link(
        ("supply-missing", "supply-reversed"),
        (*_RUNNING, "supply-range", "supply-drop", "supply-name-disagrees"),
        shared_supply,
    ),
    # A net that nothing feeds is most often a misspelt one; its capacitors are on the right one.
    Link(("supply-missing",), ("decoupling-absent", "decoupling-few"), shared_supply),
    Link(("supply-missing", "supply-reversed"), ("supply-package-split",), shared_designator),
    Link(("drive-tied",), ("supply", "decoupling", "netlist-sources-fight"), on_the_tied_net),
    Link(("supply-range",), ("supply-range",), one_rail),
    Link(
        ("drive-joined", "drive-tied"),
        (*_RUNNING, "feedback-open", "feedback-reversed"),
        shared_designator,
    ),
    # The thresholds of a comparator move with its rails.
    Link(("supply-range",), ("feedback-reversed",), switching),
    Link(
        ("feedback-reversed", "feedback-open"),
        (*_RUNNING, "bias-no-dc-path"),
        no_linear_loop,
    ),
    Link(("bias-no-dc-path",), _RUNNING, shared_designator),
    Link(
        ("feedback-reversed", "feedback-open", "bias-no-dc-path", "drive-joined", "drive-tied"),
        ("headroom",),
        dead_before,
    ),
    Link(
        ("supply-range",),
        ("headroom", "drive", "dynamics", "bias-current-error", "bias-level", "feedback-high"),
        too_low_a_supply,
    ),
    Link(("feedback-low",), ("drive-current",), network_alone),
    Link(("drive-current",), ("drive-power",), shared_designator),
    Link(("feedback-low",), ("headroom-output",), heavy_network),
    Link(("drive-current",), ("headroom-output",), heavy_load),
    Link(("drive-current",), ("drive-current",), one_load),
    # What is left of a loaded output's reach makes errors look large.
    Link(
        ("drive-current", "feedback-low"),
        ("bias-current-error", "bias-level", "headroom-offset", "feedback-high"),
        shared_designator,
    ),
    Link(
        ("dynamics-slew", "dynamics-loop-gain", "dynamics-filter"),
        ("dynamics-slew", "dynamics-loop-gain", "dynamics-filter"),
        graver,
    ),
    Link(
        ("feedback-high",),
        ("stability-phase-margin", "stability-transimpedance"),
        shared_designator,
    ),
    Link(("feedback-high",), ("bias-current-error",), by_bias_current),
    Link(
        ("bias-current-error", "feedback-high"),
        ("headroom-offset", "headroom-output", "headroom-input"),
        only_at_a_corner,
    ),
    Link(("headroom-offset",), ("headroom-output",), made_by_offset),
    Link(
        ("feedback-reversed", "feedback-open", "drive-tied"),
        ("headroom", "feedback-high", "bias-current-error"),
        touches,
    ),
    Link(("headroom-output",), ("headroom",), saturated_before),
    Link(
        ("headroom-output", "headroom-input"),
        ("headroom-output", "headroom-input"),
        one_reference,
    ),
    Link(("headroom-output",), ("headroom-offset",), makes_no_offset),
    Link(("headroom-output",), ("drive-current", "dynamics-slew", "feedback-low"), only_unclipped),
    Link(("headroom-output",), ("headroom-input",), same_side),
    Link(
        ("headroom-input",),
        ("headroom-phase-reversal", "drive-input-above-rail"),
        shared_designator,
    ),
)
