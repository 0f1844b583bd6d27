"""A review with ngspice beside it: what it fills in, and what it says of the findings."""

import msgspec

from railguard.analysis.stage import Design, Stage
from railguard.devices.catalogue import Catalogue
from railguard.engine.confirm import filled, outcome
from railguard.engine.operating import Simulated, Simulation, simulate
from railguard.engine.process import Engine
from railguard.errors import EngineError
from railguard.notices import Remark
from railguard.rules.finding import Finding

CONFIRMED = ("headroom-output", "headroom-input", "drive-current")
"""Rules whose findings a typical simulation at nominal values can confirm or refute."""


class Ngspiced:
    """One review's simulations: one deck at a time, a bad one never spoils the next."""

    def __init__(self, engine: Engine, *, fill: bool, confirm: bool) -> None:
        """Take an engine and what it is to do."""
        self._engine = engine
        self._fill = fill
        self._confirm = confirm
        self._last: Simulation | None = None

    def filled(self, design: Design, devices: Catalogue) -> Design:
        """Simulate a design; give stages what the built-in solver could not work out."""
        self._last = None
        if not design.stages:
            return design
        try:
            self._last = simulate(design, devices, self._engine)
        except EngineError as error:
            return _remarked(design, f"ngspice: {error}")
        if self._fill:
            design = filled(design, self._last)
        told = "; ".join(self._last.remarks[:6])
        return _remarked(design, f"ngspice ran with {told}.") if told else design

    def confirmed(self, findings: tuple[Finding, ...], design: Design) -> tuple[Finding, ...]:
        """Add to each finding on range and current what the simulation says of it."""
        if not self._confirm:
            return findings
        stages = {stage.designator: stage for stage in design.stages}
        return tuple(self._told(finding, stages) for finding in findings)

    def _told(self, finding: Finding, stages: dict[str, Stage]) -> Finding:
        inner = tuple(self._told(consequence, stages) for consequence in finding.consequences)
        message = finding.message
        if finding.rule in CONFIRMED and finding.designators:
            message = f"{message} {self._verdict(finding, stages)}"
        return msgspec.structs.replace(finding, message=message, consequences=inner)

    def _verdict(self, finding: Finding, stages: dict[str, Stage]) -> str:
        stage = stages.get(finding.designators[0])
        done: Simulated | None = None
        if self._last is not None and stage is not None:
            done = self._last.stages.get(stage.designator)
        if stage is None or done is None:
            return "Not confirmed: there is no simulation to hold it against."
        said = outcome(finding.rule, finding.demand, finding.limit, finding.corner, stage, done)
        word = {"confirmed": "Confirmed", "refuted": "Refuted", "open": "Not confirmed"}[said.word]
        return f"{word}: {said.why}."


def _remarked(design: Design, text: str) -> Design:
    return msgspec.structs.replace(design, remarks=(*design.remarks, Remark(text)))
