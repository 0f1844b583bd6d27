"""The heat of a package."""

from collections.abc import Iterator

from railguard.analysis.rail import Package
from railguard.analysis.stage import Design, Stage
from railguard.analysis.thermal import hottest
from railguard.notices import NotChecked
from railguard.rules.compose import OWN_TABLE, channels_of, finding, first_unknown
from railguard.rules.protocol import Limit, Limits, Outcome, Rule
from railguard.rules.severity import TABLE, evidence
from railguard.rules.wording import count, origin
from railguard.units import si

HEAT_SOURCE = "Texas Instruments OPA548 SBOS070D, power dissipation; Intersil FN6377"


def judge_power(package: Package, limits: Limits, design: Design) -> Iterator[Outcome]:
    """Judge the junction temperature of a package with the heat of all its channels."""
    stages = channels_of(package, design)
    if not stages:
        return
    stage = stages[0]
    family, case, watts, junction = stage.family, stage.case, stage.dissipation, stage.junction
    if family is None or case is None or watts is None or junction is None:
        yield _gap(package, stages)
        return
    ambient = hottest(design.settings)
    wanted, most = limits["junction"], limits["absolute"]
    if junction <= wanted:
        return
    weight = evidence(family.theta_basis, stage.output.high.demand_basis)
    beyond = junction > most
    severity = TABLE["absolute" if beyond else "guaranteed"][weight]
    limit = most if beyond else wanted
    allowed = (wanted - ambient) / case.resistance
    yield finding(
        "drive-power",
        severity,
        f"{package.designator} turns {si(watts, 'W')} into heat ({count(len(stages), 'channel')}), "
        f"so its junction reaches {si(junction, '°C')} at {si(ambient, '°C')} ambient with "
        f"{si(case.resistance, 'K/W')} ({case.name}, {origin(family.theta_basis)}); "
        f"{si(limit, '°C')} is the {'absolute' if beyond else 'usual'} limit.",
        designators=package.channels or (package.designator,),
        demand=junction,
        limit=limit,
        margin=limit - junction,
        unit="°C",
        basis=("netlist", family.supply_current.best_basis, family.theta_basis),
        remedy=f"Bring the heat down to {si(max(allowed, 0.0), 'W')}: a lower supply, a lighter "
        "load, a buffer outside the package, or a package of less thermal resistance.",
        source=HEAT_SOURCE,
        location=package.location,
    )


def _gap(package: Package, stages: tuple[Stage, ...]) -> NotChecked:
    """Say what keeps the heat from being worked out."""
    for stage in stages:
        reason = first_unknown(stage, ("device", "supply", "output", "current", "dissipation"))
        if reason is not None:
            return NotChecked(package.designator, "drive-power", reason.why, reason.add)
    missing = "supply current" if stages[0].dissipation is None else "thermal resistance"
    why = f"the {missing} of {stages[0].device} is not in the catalogue"
    return NotChecked(package.designator, "drive-power", why, OWN_TABLE)


POWER = Rule(
    name="drive-power",
    family="drive",
    looks_at="package",
    judges="The junction temperature of a package at the hottest ambient, with the heat of all its "
    "channels at their worst level.",
    reason="The output stage burns what the load does not get, most where the output stands half "
    "way between ground and rail.",
    source=HEAT_SOURCE,
    silent="Packages of unknown devices, or whose thermal resistance or load is not known, are "
    "listed as not checked. The case the card names counts; else, of those that hold so many "
    "amplifiers, the one with the highest resistance.",
    limits=(
        Limit(
            name="junction",
            default=125.0,
            unit="°C",
            meaning="junction temperature that should not be passed",
            source="Texas Instruments OPA695 SBOS293I and OPA548 SBOS070D suggest 125 °C",
        ),
        Limit(
            name="absolute",
            default=150.0,
            unit="°C",
            meaning="junction temperature that must not be passed",
            source="Texas Instruments OPA695 SBOS293I: 150 °C",
        ),
    ),
    judge=judge_power,
)

RULES = (POWER,)
