"""The review of what is staged, and what is said of it."""

import os
import posixpath
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from tempfile import TemporaryDirectory

import msgspec

from railguard.commands.hook.affected import Concerned, concerned_netlists, parents
from railguard.commands.hook.compare import only_new
from railguard.commands.hook.gather import Gathered, gather
from railguard.commands.hook.git import GitError
from railguard.commands.hook.staged import SETTINGS
from railguard.commands.hook.tree import Tree
from railguard.deck.encoding import no_netlist
from railguard.errors import RailguardError
from railguard.reviewing import DesignReview, Review, review


class Wanted(msgspec.Struct, frozen=True, kw_only=True):
    """How to review: as `railguard.review` takes it; `root` is below the repository's top."""

    new_only: bool = False
    root: str | None = None
    plugins: bool = True
    changes: dict[str, object] = {}


class Outcome(msgspec.Struct, frozen=True, kw_only=True):
    """What came of it.

    review   of the netlists concerned; None where there are none
    left_out findings that the committed version has as well
    notes    sentences on what was not reviewed, and why
    """

    review: Review | None = None
    left_out: int = 0
    notes: tuple[str, ...] = ()


def review_staged(top: str, wanted: Wanted, paths: Iterable[str] = ()) -> Outcome:
    """Review the staged content of the netlists that the staged changes concern.

    top    the repository's top folder
    paths  further files to be taken as changed, from `top`

    Raises RailguardError: git refused, or staged settings cannot be obeyed.
    """
    index = Tree(top)
    named = tuple(paths)
    netlists = concerned_netlists(index, named)
    if not netlists:
        return Outcome()
    staged = gather(index, [one.path for one in netlists])
    commits = parents(top)
    if len(commits) > 1:
        made = _made_by_the_merge(netlists, staged, top, commits)
        netlists = [n for n in netlists if n.path in made or n.path in named]
    netlists, notes = _readable(netlists, staged)
    if not netlists:
        return Outcome(notes=notes)
    found = _reviewed(staged, [one.path for one in netlists], wanted)
    notes += tuple(_unstaged_settings(index, netlists))
    if not wanted.new_only:
        return Outcome(review=found, notes=notes)
    return _compared(found, netlists, top, commits, wanted, notes)


def _made_by_the_merge(
    netlists: Sequence[Concerned], staged: Gathered, top: str, commits: Sequence[str]
) -> set[str]:
    """Return the netlists that rest on files no side of a merge had together."""
    paths = [one.path for one in netlists]
    sides = [gather(Tree(top, commit), paths) for commit in commits]
    return {path for path in paths if not any(staged.alike(side, path) for side in sides)}


def _readable(
    netlists: Sequence[Concerned], staged: Gathered
) -> tuple[list[Concerned], tuple[str, ...]]:
    """Leave out files that only a name made netlists of, and those whose content is not here."""
    kept, notes = [], []
    for one in netlists:
        foreign = no_netlist(staged.contents[one.path])
        absent = sorted(set(staged.absent).intersection(staged.rests[one.path]))
        if absent:
            notes.append(f"{one.path} is not reviewed: the content of {absent[0]} is not here.")
        elif foreign:
            notes.append(f"{one.path} is {foreign}, not a SPICE netlist; it is not reviewed.")
        else:
            kept.append(one)
    return kept, tuple(notes)


def _reviewed(files: Gathered, netlists: Sequence[str], wanted: Wanted) -> Review:
    """Review netlists in a folder of their own; paths in the report are the repository's."""
    with TemporaryDirectory(prefix="railguard-") as place:
        try:
            files.write(Path(place))
        except OSError as error:
            raise GitError(
                f"The staged files cannot be laid out for the review: {error.strerror}.",
                None,
                f"{error.filename} is where it stopped.",
            ) from error
        with _inside(place):
            return review(
                [Path(name) for name in netlists],
                root=Path(wanted.root) if wanted.root is not None else None,
                plugins=wanted.plugins,
                changes=wanted.changes,
            )


@contextmanager
def _inside(folder: str) -> Iterator[None]:
    before = Path.cwd()
    os.chdir(folder)
    try:
        yield
    finally:
        os.chdir(before)


def _compared(
    found: Review,
    netlists: Sequence[Concerned],
    top: str,
    commits: Sequence[str],
    wanted: Wanted,
    notes: tuple[str, ...],
) -> Outcome:
    """Leave out what the commits before already had."""
    old: list[dict[str, DesignReview]] = []
    for commit in commits:
        tree = Tree(top, commit)
        names = {n.path: n.before if n.before in tree.entries else n.path for n in netlists}
        there = sorted({name for name in names.values() if name in tree.entries})
        try:
            done = _reviewed(gather(tree, there), there, wanted) if there else None
        except RailguardError as error:
            notes += (f"The committed version cannot be reviewed, so all counts as new: {error}",)
            done = None
        by_path = {design.path: design for design in done.designs} if done is not None else {}
        old.append({now: by_path[was] for now, was in names.items() if was in by_path})
    designs = tuple(
        only_new(design, [side[one.path] for side in old if one.path in side])
        for design, one in zip(found.designs, netlists, strict=True)
    )
    before = sum(len(design.holding()) for design in found.designs)
    after = sum(len(design.holding()) for design in designs)
    return Outcome(
        review=msgspec.structs.replace(found, designs=designs),
        left_out=before - after,
        notes=notes,
    )


def _unstaged_settings(index: Tree, netlists: Iterable[Concerned]) -> Iterator[str]:
    """Name settings files that lie in the working tree and are not committed."""
    told = set()
    for one in netlists:
        folder = posixpath.dirname(one.path)
        while True:
            place = posixpath.join(folder, SETTINGS)
            if place in index.entries:
                break
            if place not in told and Path(index.top, place).is_file():
                told.add(place)
                yield f"{place} is not in the index, so the review did without it."
            if not folder:
                break
            folder = posixpath.dirname(folder)
