"""What the name of a net says of its level."""

import re
from functools import lru_cache

_LEVELS = (
    re.compile(r"(?i)^(?P<sign>[+-]?)(?P<whole>\d{1,3})V(?P<part>\d{0,3})(?P<tail>[A-Z]{0,6})$"),
    re.compile(r"(?i)^(?P<sign>[+-])(?P<whole>\d{1,3})(?:[.P](?P<part>\d{1,3}))?V?[A-Z]{0,6}$"),
    re.compile(r"(?i)^(?P<sign>)(?P<whole>\d{1,3})\.(?P<part>\d{1,3})V[A-Z]{0,6}$"),
    re.compile(r"^(?P<whole>\d{1,3})(?:\.(?P<part>\d{1,3}))?V?(?P<sign>[+-])$"),
    re.compile(r"(?i)^(?P<sign>[PN])(?P<whole>\d{1,3})V(?P<part>\d{0,3})$"),
)
_MAY_STATE = re.compile(r"[Vv+\-]")
"""What every name of a level holds."""
HIGHEST_NAMED = 100.0


@lru_cache(maxsize=65536)
def level_from_name(net: str) -> float | None:
    """Read the level a net's name states, V: `+12V`, `-5VA`, `12V0`, `3V3`, `VCC_3V3`, `15-`.

    A name counts only with a V or a sign; `N015` and `12` are names a program made.
    """
    if _MAY_STATE.search(net) is None:
        return None
    leaf = net.rsplit("/", 1)[-1]
    leaf = leaf.rsplit(".", 1)[-1] if leaf.count(".") and not re.search(r"\d\.\d", leaf) else leaf
    words = [leaf, *re.split(r"[_:]", leaf)]
    for word in words:
        for pattern in _LEVELS:
            found = pattern.match(word)
            if found is None:
                continue
            value = float(f"{found['whole']}.{found['part'] or 0}")
            if value > HIGHEST_NAMED:
                return None
            negative = found["sign"] in ("-", "N", "n")
            return -value if negative and value else value
    return None
