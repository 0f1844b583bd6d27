"""How the worked examples of handbooks, data sheets and application notes are tried.

"companion" in a source: inputs and printed answer were seen in the open textbook-companion
notebooks, not on the book's page; "derived": the figure was worked out from the published inputs
because the printed answer has a slip.
"""

from railguard.reviewing import review
from railguard.settings.file import parse

RAILS = "VP vp 0 15\nVN vn 0 -15\n"
FRANCO = "S. Franco, Design with Operational Amplifiers and Analog ICs, 3rd ed., ex. {} (companion)"
GAYAKWAD = "R. A. Gayakwad, Op-Amps and Linear Integrated Circuits, ex. {} (companion)"


def device(gain=2e5, gbw=1e6, **more):
    """Return the settings of an amplifier called OPAMP1 with the example's own figures."""
    lines = [
        "[[devices]]",
        'family = "OPAMP1"',
        'technology = "bipolar"',
        f"open_loop_gain = {{ typical = {gain} }}",
        f"gain_bandwidth = {{ typical = {gbw} }}",
        'names = { 1 = ["OPAMP1"] }',
        'source = { title = "figures of the worked example" }',
    ]
    lines += [f"{name} = {{ {figure} }}" for name, figure in more.items()]
    return "\n".join(lines) + "\n"


def stage(cards, settings="", supply=RAILS, name="XU1"):
    """Review a deck and return one stage."""
    found = review(
        f"worked example\n{cards}\n{supply}.end\n", parse(settings or device(), "t.toml")
    )
    return next(s for s in found.designs[0].design.stages if s.designator == name)
