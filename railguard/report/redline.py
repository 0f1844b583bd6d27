"""A redline on the screen: each change with its reason, the diff, what no card cures."""

from collections.abc import Iterator

from rich.console import Console
from rich.text import Text

from railguard.redline.difference import unified
from railguard.redline.model import Advice, Proposal, Redline, Substitute
from railguard.report.visible import encodable, visible
from railguard.report.words import count_words, plural
from railguard.report.wrapping import wrapped
from railguard.rules.finding import Finding

_HANG = 4
_STYLES = {"+": "green", "-": "red", "@": "cyan"}


def screen(redline: Redline, console: Console) -> None:
    """Print a redline; text from the netlist is shown as it is, never interpreted."""
    encoding = getattr(console.file, "encoding", None) or "utf-8"
    for text, style in _lines(redline, min(max(console.width, 60), 100)):
        console.print(Text(encodable(visible(text), encoding), style=style), soft_wrap=True)


def _lines(redline: Redline, width: int) -> Iterator[tuple[str, str]]:
    yield redline.path, "bold"
    yield from _said(_summary(redline), width, 0)
    for number, proposal in enumerate(redline.proposals, start=1):
        yield "", ""
        yield from _proposal(number, proposal, width)
    if redline.files:
        yield "", ""
        for line in unified(redline.files).splitlines():
            yield line.expandtabs(), _STYLES.get(line[:1], "")
    if redline.advice:
        yield "", ""
        yield "Not by a card", "bold"
        for advice in redline.advice:
            yield from _advice(advice, width)
    yield "", ""
    yield from _said(_after(redline), width, 0)


def _summary(redline: Redline) -> str:
    if redline.why:
        return f"Nothing can be proposed: {redline.why}."
    if not redline.proposals and not redline.remaining:
        return "No findings, so nothing is proposed."
    proved = (
        "each proved by a review of the changed deck with every rule"
        if redline.proposals
        else "no change of cards was found that cures a finding without another one"
    )
    return f"{plural(len(redline.proposals), 'change')}; {proved}."


def _proposal(number: int, proposal: Proposal, width: int) -> Iterator[tuple[str, str]]:
    head, *rest = wrapped(proposal.what, width - _HANG)
    yield f"{number:<{_HANG}}{head}", "bold"
    for line in rest:
        yield f"{'':{_HANG}}{line}", "bold"
    if proposal.left:
        eased = f"Eases {_named(proposal.finding)} to {proposal.left[0].severity}."
        yield from _said(eased, width, _HANG)
    if proposal.cures:
        yield from _said(f"Cures {'; '.join(_named(f) for f in proposal.cures)}.", width, _HANG)
    if proposal.uncovered:
        seen = "; ".join(_named(f) for f in proposal.uncovered)
        yield from _said(f"Seen only then: {seen}.", width, _HANG)
    if proposal.choice:
        yield from _said(proposal.choice, width, _HANG)
    if proposal.instead:
        head = "Or leave the cards and fit another device, the most alike first:"
        yield from _devices(head, proposal.instead, width)


def _advice(advice: Advice, width: int) -> Iterator[tuple[str, str]]:
    yield from _said(_named(advice.finding), width, 2)
    yield from _said(advice.why, width, _HANG)
    if advice.devices:
        yield from _devices(
            f"Devices that pass every limit failed there, the most alike first ({advice.tried} "
            "put in place and reviewed):",
            advice.devices,
            width,
        )
    if advice.looked and not advice.devices:
        words = "No device of the catalogue with as many amplifiers passes every limit there."
        yield from _said(words, width, _HANG)


def _devices(head: str, devices: tuple[Substitute, ...], width: int) -> Iterator[tuple[str, str]]:
    yield from _said(head, width, _HANG)
    for device in devices:
        figures = "; ".join(
            f"{f.words} {f.given}" + (f" ({f.needed} needed)" if f.needed else "")
            for f in device.figures
        )
        yield from _said(f"{device.code}: {figures}.", width, _HANG + 2)
        for remark in device.remains:
            yield from _said(f"Still to be said there: {remark}", width, _HANG + 4)


def _named(finding: Finding) -> str:
    where = ", ".join((*finding.designators, *(finding.nets if not finding.designators else ())))
    if finding.family in ("decoupling", "supply") and finding.nets:
        where = ", ".join(finding.nets)
    return f"{finding.rule} of {where} ({finding.severity})" if where else finding.rule


def _after(redline: Redline) -> str:
    gone = f"{plural(len(redline.gone), 'finding')} gone, none new"
    if redline.uncovered:
        gone = f"{gone}, {len(redline.uncovered)} seen only now"
    left = (
        f"{count_words(redline.remaining)} left ({'; '.join(_named(f) for f in redline.remaining)})"
        if redline.remaining
        else "nothing left"
    )
    if not redline.proposals:
        return f"Verdict: {redline.verdict}; {left}."
    return f"After these changes: {gone}, {left}. Verdict: {redline.verdict}."


def _said(text: str, width: int, indent: int) -> Iterator[tuple[str, str]]:
    for line in wrapped(visible(text), width - indent):
        yield f"{'':{indent}}{line}", ""
