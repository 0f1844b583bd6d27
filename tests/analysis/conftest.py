"""Circuits for the analysis tests, as text."""

from collections.abc import Callable

import pytest

from railguard.analysis.design import analyse
from railguard.analysis.recognise import keeps_closed
from railguard.analysis.solution import Options
from railguard.analysis.stage import Design, Stage
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.settings.directives import apply
from railguard.settings.file import parse

SPLIT = """
VP vp 0 15
VN vn 0 -15
CP vp 0 100n
CN vn 0 100n
"""


@pytest.fixture
def design() -> Callable[..., Design]:
    """Analyse a netlist's cards, split supply of 15 V added unless told otherwise."""

    def build(
        cards: str, settings: str = "", supply: str = SPLIT, options: Options | None = None
    ) -> Design:
        stated = parse(settings, "railguard.toml")
        devices = catalogue.load(stated.devices)
        circuit = flatten(deck_from_text(f"title\n{cards}\n{supply}"), keeps_closed(devices))
        stated, _ = apply(stated, circuit.directives)
        return analyse(circuit, stated, devices, options or Options())

    return build


@pytest.fixture
def stage(design: Callable[..., Design]) -> Callable[..., Stage]:
    """Analyse a netlist and return its only stage, or the one named."""

    def build(cards: str, settings: str = "", supply: str = SPLIT, name: str = "XU1") -> Stage:
        found = design(cards, settings, supply).stages
        return next(s for s in found if s.designator == name)

    return build
