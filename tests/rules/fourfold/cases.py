"""All netlists of all rules."""

from tests.rules.fourfold import (
    bias,
    circuit,
    decoupling,
    drive,
    dynamics,
    feedback,
    headroom,
    reading,
    stability,
    supply,
)
from tests.rules.fourfold.four import Four

FAMILIES = (
    supply, decoupling, headroom, drive, bias, feedback, dynamics, stability, reading, circuit,
)  # fmt: skip
ALL: dict[str, Four] = {name: four for family in FAMILIES for name, four in family.CASES.items()}
