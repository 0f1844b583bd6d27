"""railguard: a design-rule checker for op-amp stages in SPICE netlists.

From Python there are two ways in, `review` and `assert_sound`, and the values they take and give.
They are imported when first asked for, so that `import railguard` costs nothing.
"""

import importlib
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from railguard.errors import RailguardError
    from railguard.notices import NotChecked
    from railguard.plugins.assertion import assert_sound
    from railguard.reviewing import DesignReview, Review, review
    from railguard.rules.finding import Finding
    from railguard.settings.model import Settings

__version__ = "0.1.0"

__all__ = [
    "DesignReview",
    "Finding",
    "NotChecked",
    "RailguardError",
    "Review",
    "Settings",
    "__version__",
    "assert_sound",
    "review",
]

_HOMES = {
    "DesignReview": "railguard.reviewing",
    "Finding": "railguard.rules.finding",
    "NotChecked": "railguard.notices",
    "RailguardError": "railguard.errors",
    "Review": "railguard.reviewing",
    "Settings": "railguard.settings.model",
    "assert_sound": "railguard.plugins.assertion",
    "review": "railguard.reviewing",
}


def __getattr__(name: str) -> object:
    """Import a public name when it is first asked for."""
    if name not in _HOMES:
        raise AttributeError(f"module 'railguard' has no attribute {name!r}")
    value: object = getattr(importlib.import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
