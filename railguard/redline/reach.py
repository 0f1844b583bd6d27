"""What no card can cure, seen from the design: the reason in words."""

from railguard.analysis.stage import Design
from railguard.redline.pins import nearest_fed
from railguard.redline.table import CURES
from railguard.rules.compose import stage_named
from railguard.rules.finding import Finding

_REASONS = {
    "supply-range": "the rail or the device has to be another one",
    "supply-name-disagrees": "nothing says whether the source or the name is right",
    "supply-package-split": "the channel needs a package or a rail of its own",
    "dynamics-loop-gain": "the device has to be a faster one",
    "dynamics-slew": "the device has to be a faster one",
    "dynamics-filter": "the device has to be a faster one",
    "drive-power": "heat is the package's, the rail's or the load's",
    "headroom-differential": "clamps between the inputs are part of the device",
    "feedback-matching": "tolerance is ordered with the resistors, not drawn",
    "netlist-device-unknown": "its limits stand in no data sheet that is known here",
}
"""Why no card cures what a rule finds, where the rule says so by itself."""


def no_card(finding: Finding, design: Design) -> str:
    """Return why no card can cure a finding; "" where one may."""
    if finding.rule == "feedback-matching" and finding.basis == ("netlist",):
        return "the reference wants an amplifier of its own"
    if finding.rule not in CURES:
        return _REASONS.get(finding.rule, "only who drew it knows what was meant")
    if finding.rule == "supply-missing" and not any(
        nearest_fed(net, design) for net in finding.nets
    ):
        return "nothing in the netlist says what is to feed it"
    stage = stage_named(finding.designators[0], design) if finding.designators else None
    if stage is None:
        return ""
    if finding.rule == "drive-current" and finding.demand:
        own = stage.feedback.current or 0.0
        if own < 0.5 * finding.demand and not stage.current.load_capacitance:
            into = " or ".join(name for c in stage.current.carriers for name in c.designators)
            into = f"base of {into}" if into else f"load ({stage.current.into or 'stated'})"
            return f"the current goes into the {into}, as given"
    if finding.rule == "feedback-reversed" and finding.severity == "remark":
        return "it is a comparator, as its use shows"
    if finding.rule == "feedback-open" and finding.severity == "remark":
        return "it is a comparator, as its use shows"
    if finding.rule == "feedback-open" and not stage.feedback.elements:
        others = [
            e
            for e in design.circuit.elements
            if stage.inputs.minus.net in e.nets and e.location != stage.location
        ]
        if others:
            return "nothing in the netlist says which gain is wanted"
    return ""
