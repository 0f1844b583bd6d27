"""Rules of a house of our own: which op-amps it no longer buys."""

from railguard.rules.finding import Finding
from railguard.rules.protocol import Rule

LIST = "house list, revision C"


def judge(stage, limits, design):
    """Speak of every JFET op-amp that amplifies."""
    if stage.family is not None and stage.family.technology == "jfet" and stage.use == "linear":
        yield Finding(
            rule="bias-house-no-jfet",
            family="bias",
            severity="remark",
            designators=(stage.designator,),
            location=stage.location,
            message=f"{stage.schematic} is a JFET op-amp, which the house no longer buys.",
            remedy="Take one from the house list.",
            source=LIST,
        )


RULE = Rule(
    name="bias-house-no-jfet",
    family="bias",
    looks_at="stage",
    judges="JFET op-amps, which the house no longer buys.",
    reason="One maker less to keep in stock.",
    source=LIST,
    judge=judge,
)
