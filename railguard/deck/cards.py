"""Logical lines to items: the words of a card, with its assignments, calls and groups.

The grammar says what a card is. Nearly every card is read by a faster path made of the same
terminals, taken from the grammar's text: a card of plain words is split at its blanks, any other
is cut into tokens in one go. What that path does not take goes through the grammar, which also
says what is wrong with it. A property test holds the two equal.
"""

import re

import msgspec

from railguard.deck.language import parser, terminals


class Assignment(msgspec.Struct, frozen=True, gc=False):
    """`key=value`; the key lower-cased."""

    key: str
    value: "str | Call | Group"


class Call(msgspec.Struct, frozen=True, gc=False):
    """`NAME(items)`: a source function; the name lower-cased."""

    name: str
    items: "tuple[str | Assignment | Call | Group, ...]"


class Group(msgspec.Struct, frozen=True, gc=False):
    """Items in parentheses of their own."""

    items: "tuple[str | Assignment | Call | Group, ...]"


Items = tuple["str | Assignment | Call | Group", ...]

DEEPEST = 64
"""Parentheses inside parentheses on one card."""

_T = terminals("spice.lark")
_WORD_ONLY = re.compile(_T["PLAIN"])
NOT_PLAIN = re.compile(
    f"[{re.escape(''.join(c for c in map(chr, range(33, 127)) if not _WORD_ONLY.match(c)))}§\\[]"
)
"""What a card of plain words never holds: what the grammar's PLAIN refuses, and what begins a
bracketed group or a schematic's own designator."""
# In the order the grammar's lexer tries them: by priority, then those that cannot be confused.
# A plain word that no parenthesis follows is tried before WORD, which looks for one first.
_TOKEN = re.compile(
    rf"\s*+(?:(?P<key>{_T['KEY']})\s*=\s*|(?P<call>{_T['FUNCTION']})\(|"
    rf"(?P<labelled>{_T['BRACED']})\s*=|"
    rf"(?P<atom>{_T['BRACKETED']}|(?>{_T['PLAIN']})(?!\()|{_T['WORD']}|{_T['BRACED']}|"
    rf"{_T['SQUOTED']}|{_T['DQUOTED']})|"
    r"(?P<open>\()|(?P<close>\))|(?P<comma>,)|(?P<bad>\S))"
)


_BEHAVIOURAL = re.compile(
    rf"([bB]{_T['PLAIN']}?)\s+({_T['PLAIN']})\s+({_T['PLAIN']})\s+([viVI])\s*=(?!=)\s*(.+)"
)


class CardError(Exception):
    """A card the grammar does not take; `at` is the offset of the first thing that is wrong."""

    def __init__(self, reason: str, at: int) -> None:
        self.reason = reason
        self.at = at
        super().__init__(reason)


def items_of(text: str) -> Items:
    """Split a card into items.

    Raises  CardError
    """
    if NOT_PLAIN.search(text) is None:
        return tuple(text.split())
    items = _tokenised(text)
    return parse_items(text) if items is None else items


def _tokenised(text: str) -> Items | None:
    """Split a card by its tokens; None where the grammar has to say what it is."""
    level: list[str | Assignment | Call | Group] = []
    opened: list[tuple[str | None, str | None, list[str | Assignment | Call | Group]]] = []
    key: str | None = None
    for token in _TOKEN.finditer(text):
        kind = token.lastgroup
        made: str | Call | Group
        if kind == "atom" or (kind == "labelled" and key is None):
            made = token[kind]
        elif kind == "call" or kind == "open":
            if len(opened) >= DEEPEST:
                return None
            opened.append((key, token["call"], level))
            key, level = None, []
            continue
        elif kind == "close" and opened and key is None:
            key, name, outer = opened.pop()
            made = Group(tuple(level)) if name is None else Call(name.lower(), tuple(level))
            level = outer
        elif kind == "key" and key is None:
            key = token["key"]
            continue
        elif kind == "comma" and key is None:
            continue
        else:
            return None
        if key is None:
            level.append(made)
        else:
            level.append(Assignment(key.lower(), made))
            key = None
    return None if opened or key is not None else tuple(level)


def behavioural_items(text: str) -> Items | None:
    """Split `B1 out 0 V=...`, whose relation is taken as it stands to the end of the card."""
    found = _BEHAVIOURAL.match(text)
    if found is None:
        return None
    name, plus, minus, key, body = found.groups()
    return name, plus, minus, Assignment(key.lower(), body)


def parse_items(text: str) -> Items:
    """Split a card into items through the grammar, whatever it looks like.

    Raises  CardError
    """
    from lark import Token, Tree, UnexpectedInput  # imported only when a card needs the grammar

    if _nesting(text) > DEEPEST:
        raise CardError(f"its parentheses are nested deeper than {DEEPEST}", text.find("("))
    try:
        tree = parser("spice.lark").parse(text)
    except UnexpectedInput as error:
        raise CardError(*_reason(text, error.pos_in_stream)) from error

    def convert(node: "Tree[Token] | Token") -> "str | Assignment | Call | Group | None":
        if isinstance(node, Token):
            return None if node.type == "COMMA" else str(node)
        if node.data == "assignment":
            key, _, value = node.children
            made = convert(value)
            if made is None or isinstance(made, Assignment):
                return None
            return Assignment(str(key).lower(), made)
        if node.data == "labelled":
            return str(node.children[0])
        inner = [convert(c) for c in node.children if not _is_bracket(c)]
        kept = tuple(item for item in inner if item is not None)
        if node.data == "call":
            return Call(str(kept[0]).lower(), kept[1:])
        return Group(kept)

    made = (convert(child) for child in tree.children)
    return tuple(item for item in made if item is not None)


def _is_bracket(node: object) -> bool:
    return getattr(node, "type", "") in ("LPAR", "RPAR")


def _nesting(text: str) -> int:
    deepest = depth = 0
    for character in text:
        depth += (character == "(") - (character == ")")
        deepest = max(deepest, depth)
    return deepest


def _reason(text: str, at: int | None) -> tuple[str, int]:
    """Say in plain words what is unbalanced, and where it opens."""
    for opening, closing, words in (("{", "}", "brace"), ("(", ")", "parenthesis")):
        if text.count(opening) != text.count(closing):
            few = closing if text.count(opening) > text.count(closing) else opening
            place = max(text.rfind(opening if few == closing else closing), 0)
            return f"a {words} is not balanced: a {few} is missing", place
    for quote in "'\"":
        if text.count(quote) % 2:
            return f"a quote ({quote}) is not closed", text.rfind(quote)
    place = at if at is not None and at >= 0 else 0
    return f'"{text[place : place + 12]}" was not expected here', place
