"""Logical lines to items: the words of a card, with its assignments, calls and groups.

Most cards are words between blanks. Those take a fast path that the same word terminal defines;
every other card goes through the grammar.
"""

import re

import msgspec

from railguard.deck.language import grammar_text, parser


class Assignment(msgspec.Struct, frozen=True):
    """`key=value`; the key lower-cased."""

    key: str
    value: "str | Call | Group"


class Call(msgspec.Struct, frozen=True):
    """`NAME(items)`: a source function; the name lower-cased."""

    name: str
    items: "tuple[str | Assignment | Call | Group, ...]"


class Group(msgspec.Struct, frozen=True):
    """Items in parentheses of their own."""

    items: "tuple[str | Assignment | Call | Group, ...]"


Items = tuple["str | Assignment | Call | Group", ...]

_SPECIAL = re.compile(r"[,=(){}\[\]'\"]")


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
    if _SPECIAL.search(text) is None:
        return tuple(text.split())
    return parse_items(text)


def parse_items(text: str) -> Items:
    """Split a card into items through the grammar, whatever it looks like.

    Raises  CardError
    """
    from lark import Token, Tree, UnexpectedInput  # imported only when a card needs the grammar

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
        inner = [convert(c) for c in node.children if not _is_bracket(c)]
        kept = tuple(item for item in inner if item is not None)
        if node.data == "call":
            return Call(str(kept[0]).lower(), kept[1:])
        return Group(kept)

    made = (convert(child) for child in tree.children)
    return tuple(item for item in made if item is not None)


def _is_bracket(node: object) -> bool:
    return getattr(node, "type", "") in ("LPAR", "RPAR")


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


def word_terminal() -> str:
    """Return the pattern of the grammar's WORD terminal, for holding the fast path to it."""
    found = re.search(r"^WORD\.3: /(.+)/$", grammar_text("spice.lark"), re.MULTILINE)
    return found[1] if found else ""
