"""What to do where no card cures: another device from the catalogue, or words.

Every device named has been put in place and the whole design reviewed with it.
"""

import math
from collections.abc import Iterator

import msgspec

from railguard.analysis.design import analyse
from railguard.analysis.rail import Package
from railguard.analysis.stage import Design, Stage
from railguard.devices import catalogue
from railguard.devices.catalogue import Catalogue
from railguard.devices.match import spell_out
from railguard.devices.model import Device
from railguard.redline.figures import CHECKS
from railguard.redline.model import Advice, Figure, Substitute
from railguard.redline.proof import every, installed
from railguard.redline.reach import no_card
from railguard.reviewing import DesignReview
from railguard.rules.compose import channels_of, stage_named
from railguard.rules.finding import Finding
from railguard.rules.registry import judge

NAMED = 5
"""Devices named at most; who wants more has `railguard devices`."""
TRIED = 40
"""Devices reviewed in place before the search ends."""


def advise(finding: Finding, review: DesignReview, *, tried: bool = True) -> Advice:
    """Say what to do about a finding that stays, with devices that would pass in its place.

    tried  False where the reviews allowed for a deck were spent before every change was tried
    """
    reason = no_card(finding, review.design)
    if not tried:
        why = "Not every change was tried: the deck has too many findings for one redline."
        return Advice(finding=finding, why=f"{why} {finding.remedy}".strip())
    why = f"No card cures it: {reason}." if reason else (
        "No change of cards was found that cures it without another finding."
    )  # fmt: skip
    why = f"{why} {finding.remedy}"
    if finding.rule not in CHECKS:
        return Advice(finding=finding, why=why.strip())
    devices, count = substitutes(finding, review)
    return Advice(finding=finding, why=why.strip(), devices=devices, tried=count, looked=True)


def substitutes(finding: Finding, review: DesignReview) -> tuple[tuple[Substitute, ...], int]:
    """Return devices that pass in place of the fitted one, and how many were tried there."""
    design = review.design
    package = next((p for p in design.packages if set(p.channels) & set(finding.designators)), None)
    if package is None:
        return (), 0
    stages = channels_of(package, design)
    failed = _failed(stages, review)
    known = catalogue.load(design.settings.devices)
    size = package.size or len(package.channels)
    found: list[Substitute] = []
    tried = 0
    for device, figures in _ranked(failed, stages, known, design):
        codes = _codes(device.family, size, known)
        if not codes or len(found) >= NAMED or tried >= TRIED:
            continue
        tried += 1
        remains = _passes(codes[0], package, failed, review, known)
        if remains is not None:
            found.append(
                Substitute(
                    family=device.family,
                    code=codes[0],
                    description=device.description,
                    figures=figures,
                    remains=remains,
                )
            )
    return tuple(found), tried


def _codes(family: str, channels: int, known: Catalogue) -> tuple[str, ...]:
    """Return the order codes of a family that hold so many amplifiers."""
    every_one = (c for base in known.order_codes(family) for c in spell_out(base))
    return tuple(c for c in every_one if known.match(c).channels == channels)


def _failed(stages: tuple[Stage, ...], review: DesignReview) -> tuple[Finding, ...]:
    """Return every finding of a package that another device may cure."""
    own = {s.designator for s in stages}
    return tuple(f for f in every(review.findings) if f.rule in CHECKS and own & set(f.designators))


def _ranked(
    failed: tuple[Finding, ...], stages: tuple[Stage, ...], known: Catalogue, design: Design
) -> Iterator[tuple[Device, tuple[Figure, ...]]]:
    """Yield devices whose figures meet every failed limit, those most like the fitted one first."""
    present = stages[0].family
    fitting: list[tuple[float, str, Device, tuple[Figure, ...]]] = []
    for family in known.families():
        device = known.device(family)
        if present is not None and (
            family == present.family or device.feedback != present.feedback
        ):
            continue
        figures: list[Figure] = []
        fits = _takes_supply(stages[0], device)
        for finding in failed:
            stage = stage_named(finding.designators[0], design)
            for figure, meets in CHECKS[finding.rule](finding, stage, device) if stage else ():
                fits = fits and meets
                if figure not in figures:
                    figures.append(figure)
        if fits and figures:
            fitting.append((_unlike(device, present), family, device, tuple(figures)))
    for _, _, device, kept in sorted(fitting, key=lambda entry: entry[:2]):
        yield device, kept


def _takes_supply(stage: Stage, device: Device) -> bool:
    total, low, high = stage.supply.total, device.supply_low, device.supply_high
    if total is None or high is None:
        return False
    return (low or 0.0) <= total <= high


def _unlike(device: Device, present: Device | None) -> float:
    """Return how far a device is from the fitted one, in decades of the figures both list.

    Another technology counts half a decade: bias current and noise change their character.
    """
    if present is None:
        return 0.0
    distance = 0.0 if device.technology == present.technology else 0.5
    for name in ("gain_bandwidth", "slew_rate", "supply_current", "offset_voltage"):
        one, other = getattr(device, name).best, getattr(present, name).best
        distance += abs(math.log10(one / other)) if one and other else 1.0
    return distance


def _passes(
    code: str,
    package: Package,
    failed: tuple[Finding, ...],
    review: DesignReview,
    known: Catalogue,
) -> tuple[str, ...] | None:
    """Review the design with a device in place; None where a failed limit stays or a new one is.

    Return what remains to be said of the package's stages.
    """
    before = review.design
    elements = tuple(
        msgspec.structs.replace(e, model=code)
        if any(c.startswith(e.designator) for c in package.channels) and e.model
        else e
        for e in before.circuit.elements
    )
    circuit = msgspec.structs.replace(before.circuit, elements=elements)
    design = analyse(circuit, before.settings, known, None)
    now = tuple(every(judge(design, installed(review).rules).findings))
    own = set(package.channels)
    rules = {(f.rule, d) for f in failed for d in f.designators}
    if any((f.rule, d) in rules for f in now for d in f.designators):
        return None
    old = {(f.rule, d) for f in every(review.findings) for d in (*f.designators, *f.nets)}
    for finding in now:
        if not any((finding.rule, d) in old for d in (*finding.designators, *finding.nets)):
            return None
    return tuple(f.message for f in now if own & set(f.designators))
