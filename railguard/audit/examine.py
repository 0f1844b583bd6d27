"""One file of an audit: what it is, and its review where it is a design.

This is the whole of a worker's work. Nothing in it depends on where it runs.
"""

import datetime as dt
import hashlib
import time
from collections import Counter
from collections.abc import Callable, Iterator
from functools import lru_cache
from pathlib import Path

import msgspec

from railguard.analysis.stage import Design
from railguard.audit.archives import ArchiveError
from railguard.audit.sniff import LIBRARIES, SURE, is_archive, sort_of, suffix, worth_opening
from railguard.audit.trees import Over, Tree, Trees
from railguard.audit.wire import Found, Outcome, Plan, State, Task, Unknown
from railguard.deck.bounds import Bounds
from railguard.deck.files import Deck, read_deck
from railguard.errors import RailguardError
from railguard.reviewing import DesignReview, review_deck
from railguard.rules.finding import Finding
from railguard.settings.file import FILE_NAME, parse
from railguard.settings.model import Settings


class Examiner:
    """Reviews files one by one under one plan."""

    def __init__(self, plan: Plan) -> None:
        self._plan = plan
        self._bounds = Bounds(file_bytes=plan.budget.netlist)
        self._trees = Trees(plan.roots, plan.budget)
        self._digest = hashlib.sha256(
            msgspec.msgpack.encode(
                (plan.build, plan.settings, plan.hold_at, plan.trust, plan.budget)
            )
        ).digest()
        self._settings = lru_cache(maxsize=256)(self._parsed)

    def examine(self, task: Task, began: Callable[[str], None] = lambda _: None) -> Outcome:
        """Look at one file.

        began  is told the key of the result before the review begins
        """
        start = time.process_time()
        try:
            outcome = self._opened(task) if task.opens else self._looked_at(task, began)
        except (OSError, ArchiveError) as error:
            outcome = _outcome(task, "unreadable", why=_reason(error))
        return msgspec.structs.replace(outcome, seconds=time.process_time() - start)

    def _opened(self, task: Task) -> Outcome:
        archive = self._trees.archive(task)
        around = (*task.archives, task.path)
        members, settings = [], []
        for name in archive.names:
            path = f"{task.path}/{name}"
            if name.rsplit("/", 1)[-1] == FILE_NAME:
                settings.append(path)
            elif is_archive(name):
                members.append(Task(task.root, path, around, opens=True))
            elif worth_opening(name):
                members.append(Task(task.root, path, around))
        why = "; ".join(f"{name}: {reason}" for name, reason in archive.refused[:20])
        return msgspec.structs.replace(
            _outcome(task, "archive", why=why), members=tuple(members), settings=tuple(settings)
        )

    def _looked_at(self, task: Task, began: Callable[[str], None]) -> Outcome:
        path = Path(task.path)
        tree = self._trees.of(task)
        data = tree.read(path, self._plan.budget.netlist)
        if len(data) > self._plan.budget.netlist:
            return self._too_long(task, data)
        sort = sort_of(task.path, data)
        if sort == "other":
            return _outcome(task, "other")
        root = Path(task.archives[-1]) if task.archives else Path()
        deck = read_deck(path, self._bounds, root, Over(tree, path, data))
        key = self._key(deck, data, self._stated(tree, task))
        if key == task.known:
            return _outcome(task, "same", key=key)
        began(key)
        if sort == "library":
            library = _outcome(task, "library", key=key)
            return msgspec.structs.replace(library, sha256=deck.sha256, title=deck.title)
        if not deck.readable:
            return _outcome(task, "unreadable", key=key, why=deck.problems[0].message)
        return self._reviewed(task, deck, key, tree)

    def _too_long(self, task: Task, data: bytes) -> Outcome:
        """Record what passes the bound, where it may be a netlist."""
        if suffix(task.path) not in SURE | LIBRARIES and sort_of(task.path, data) == "other":
            return _outcome(task, "other")
        why = f"It is larger than the {self._plan.budget.netlist:,} bytes a netlist may have."
        return _outcome(task, "unreadable", why=why)

    def _key(self, deck: Deck, data: bytes, stated: tuple[str, str]) -> str:
        digest = hashlib.sha256(self._digest)
        for part in (deck.sha256 or hashlib.sha256(data).hexdigest(), *stated):
            digest.update(hashlib.sha256(part.encode()).digest())
        # What the reader could not include may be there the next time, with nothing else changed.
        for problem in deck.problems:
            digest.update(problem.message.encode())
        if _dated(deck, stated[1]):
            digest.update(self._plan.day.encode())
        return digest.hexdigest()[:32]

    def _stated(self, tree: Tree, task: Task) -> tuple[str, str]:
        """Return name and text of the settings file that counts for a file."""
        if self._plan.trust:
            for folder in Path(task.path).parents:
                place = folder / FILE_NAME
                if tree.is_file(place):
                    text = tree.read(place, 1_000_000).decode("utf-8-sig", "replace")
                    return place.as_posix(), text
        return FILE_NAME, self._plan.settings

    def _parsed(self, name: str, text: str) -> Settings:
        settings = parse(text, name) if text else Settings()
        day = dt.date.fromisoformat(self._plan.day)
        settings = msgspec.structs.replace(settings, as_of=day)
        if self._plan.hold_at is not None:
            settings = msgspec.structs.replace(settings, hold_at=self._plan.hold_at)
        return settings

    def _reviewed(self, task: Task, deck: Deck, key: str, tree: Tree) -> Outcome:
        try:
            settings = self._settings(*self._stated(tree, task))
            found, _ = review_deck(deck, settings)
        except RailguardError as error:
            return _outcome(task, "unreadable", key=key, why=str(error))
        except RecursionError:
            return _outcome(task, "stopped", key=key, why="It is nested too deeply.")
        design = found.design
        devices = {
            s.designator: s.family.family if s.family is not None else s.device
            for s in design.stages
        }
        for package in design.packages:
            devices.setdefault(package.designator, package.family or package.device)
        return Outcome(
            root=task.root,
            path=task.path,
            state="design",
            key=key,
            sha256=deck.sha256,
            title=deck.title,
            kind=design.kind,
            verdict=found.verdict,
            judged=found.judged,
            open=dict(sorted(Counter(note.rule for note in found.not_checked).items())),
            stages=len(design.stages),
            findings=tuple(_flat(found.findings, devices, task.path)),
            unknown=tuple(_unknown(design)),
            includes=tuple(dict.fromkeys(_near(name) for name in deck.files[1:])),
            circuit=_circuit(found, task.path),
        )


def _outcome(task: Task, state: State, *, key: str = "", why: str = "") -> Outcome:
    return Outcome(root=task.root, path=task.path, state=state, key=key, why=why)


def _reason(error: Exception) -> str:
    if isinstance(error, OSError):
        return f"It cannot be read: {error.strerror or error}."
    return str(error)


def _dated(deck: Deck, settings: str) -> bool:
    """Tell whether a result may hang on the day: a waiver ends."""
    return "until" in settings or any("until" in text.lower() for text, _ in deck.directives)


def _near(name: str) -> str:
    return Path(name).as_posix()


def _unknown(design: Design) -> Iterator[Unknown]:
    """Yield what nobody knows: cards that may be op-amps, and op-amps without figures."""
    for one in design.unrecognised:
        if one.sort == "unknown":
            yield Unknown(one.designator, one.name, one.pins, one.nearest)
    for stage in design.stages:
        if stage.family is None and not stage.generic and stage.device:
            yield Unknown(stage.designator, stage.device, 0, "")


def _circuit(found: DesignReview, path: str) -> str:
    """Return the included file that holds all op-amps of a deck that runs analyses, or ""."""
    holders = {s.location.file for s in found.design.stages if s.location is not None}
    if len(holders) != 1 or not found.design.stages:
        return ""
    holder = _near(holders.pop())
    return holder if holder != path and found.design.circuit.analyses else ""


def _flat(findings: tuple[Finding, ...], devices: dict[str, str], deck: str) -> Iterator[Found]:
    """Yield findings with what follows from them behind each."""
    number = 0
    for finding in findings:
        yield _found(finding, -1, devices, deck)
        parent = number
        number += 1
        for consequence in finding.consequences:
            yield _found(consequence, parent, devices, deck)
            number += 1


def _found(finding: Finding, parent: int, devices: dict[str, str], deck: str) -> Found:
    named = (devices[d] for d in finding.designators if d in devices)
    at = finding.location
    return Found(
        parent=parent,
        rule=finding.rule,
        family=finding.family,
        severity=finding.severity,
        designators=finding.designators,
        nets=finding.nets,
        device=next(named, ""),
        demand=finding.demand,
        limit=finding.limit,
        margin=finding.margin,
        margin_share=finding.margin_share,
        unit=finding.unit,
        message=finding.message,
        remedy=finding.remedy,
        source=finding.source,
        place=_near(at.file) if at is not None else "",
        line=at.line if at is not None else None,
        fingerprint=finding.fingerprint(deck),
        waived=finding.waiver is not None,
    )
