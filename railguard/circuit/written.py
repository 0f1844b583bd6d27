"""Items and parameters as text: written out again, quotes taken off, assignments cut apart."""

import re
from collections.abc import Mapping

from railguard.deck.cards import Assignment, Call, Group


def unquoted(text: str) -> str:
    """Take the braces or quotes off an expression."""
    text = text.strip()
    if len(text) >= 2 and text[0] + text[-1] in ("{}", "''", '""'):
        return text[1:-1].strip()
    return text


def text_of(item: "str | Assignment | Call | Group") -> str:
    """Write an item out again."""
    match item:
        case str():
            return item
        case Assignment():
            return f"{item.key}={text_of(item.value)}"
        case Call():
            return f"{item.name}({' '.join(text_of(i) for i in item.items)})"
        case Group():
            return f"({' '.join(text_of(i) for i in item.items)})"


def split_parameters(rest: list[str]) -> list[tuple[str, str]]:
    """Cut `a=1 b = {a*2}, c=3` into names and values; a value runs to the next `name =`."""
    text = rest[0] if rest else ""
    found: list[tuple[str, str]] = []
    starts = []
    depth, quote = 0, ""
    for index, character in enumerate(text):
        if quote:
            quote = "" if character == quote else quote
        elif character in "'\"":
            quote = character
        elif character in "({":
            depth += 1
        elif character in ")}":
            depth -= 1
        elif character == "=" and depth == 0 and _assigns(text, index):
            starts.append(index)
    for number, at in enumerate(starts):
        name_at = _name_start(text, at)
        end = _name_start(text, starts[number + 1]) if number + 1 < len(starts) else len(text)
        value = text[at + 1 : end].strip().rstrip(",").strip()
        found.append((text[name_at:at].strip().lstrip(",").strip(), value))
    return found


def _assigns(text: str, at: int) -> bool:
    before, after = text[at - 1 : at], text[at + 1 : at + 2]
    return before not in ("=", "<", ">", "!") and after != "="


def _name_start(text: str, at: int) -> int:
    index = at
    while index and text[index - 1].isspace():
        index -= 1
    if index and text[index - 1] == ")":
        index = text.rfind("(", 0, index)
    while index and (text[index - 1].isalnum() or text[index - 1] in "_.$"):
        index -= 1
    return index


_NAME = re.compile(r"(?<![\w.$#:@])[a-z_][\w.$#:]*(?!\s*\()", re.IGNORECASE)


def parameter_cycle(parameters: Mapping[str, str]) -> tuple[str, ...]:
    """Return the first chain of parameters that ends where it begins, or nothing.

    parameters  values as written, by lower-cased name
    """
    rests = {
        name: [w for w in map(str.lower, _NAME.findall(text)) if w in parameters]
        for name, text in parameters.items()
    }
    done: set[str] = set()
    for start in rests:
        path, queue = [start], [iter(rests[start])]
        while queue and start not in done:
            step = next(queue[-1], None)
            if step is None:
                done.add(path.pop())
                queue.pop()
            elif step in path:
                return (*path[path.index(step) :], step)
            elif step not in done:
                path.append(step)
                queue.append(iter(rests[step]))
    return ()
