"""How much of a netlist is read and expanded."""

import msgspec


class Bounds(msgspec.Struct, frozen=True, kw_only=True):
    """How much of a netlist is read and expanded; all can be set by the user.

    file_bytes       one file
    total_bytes      a netlist with everything it includes, as often as it is included
    includes         include cards followed
    line_characters  one logical line
    word_characters  one name, value or expression
    include_depth    files including files
    subcircuit_depth instances inside instances
    elements         after expansion, empty instances included
    expression       nested parentheses of one expression
    """

    file_bytes: int = 32_000_000
    total_bytes: int = 64_000_000
    includes: int = 2_000
    line_characters: int = 1_000_000
    word_characters: int = 10_000
    include_depth: int = 32
    subcircuit_depth: int = 64
    elements: int = 500_000
    expression: int = 64
