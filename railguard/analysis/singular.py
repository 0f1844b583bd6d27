"""Why equations have no single answer: the nets and elements that leave it open."""

from collections.abc import Iterable, Sequence

import numpy as np

from railguard.analysis.network import Network
from railguard.circuit.model import Element

_SHARE = 0.1
"""Share of the largest entry from which a name belongs to what is open."""
_MOST = 4


def open_nets(network: Network) -> tuple[str, ...]:
    """Return the nets whose level the equations at DC do not settle, the clearest first."""
    _, _, right = np.linalg.svd(network.g)
    weight = np.abs(right[-1])
    names = {row: net for net, row in network.rows.items()}
    order = np.argsort(-weight)
    return tuple(
        names[int(row)]
        for row in order
        if int(row) in names and weight[row] > _SHARE * weight.max()
    )[:_MOST]


def steering(network: Network, elements: Iterable[Element], nets: tuple[str, ...]) -> list[str]:
    """Return the sources that take part: those of the equations that repeat or contradict others.

    nets  those whose level is open; controlled sources on them count too
    """
    left, _, _ = np.linalg.svd(network.g)
    weight = np.abs(left[:, -1])
    found = [b.designator for b in network.branches if weight[b.row] > _SHARE * weight.max()]
    for element in elements:
        if element.kind in ("E", "F", "G", "H") and set(element.nets[:2]) & set(nets):
            found.append(element.designator)
    return list(dict.fromkeys(found))[:_MOST]


def explained(network: Network, elements: Iterable[Element]) -> tuple[str, list[str], list[str]]:
    """Return why a network at DC has no single answer, in words, with elements and nets."""
    nets = open_nets(network)
    sources = steering(network, elements, nets)
    where = f" of {'nets' if len(nets) > 1 else 'net'} {_listed(nets)}" if nets else ""
    leave = "leave" if len(sources) > 1 else "leaves"
    who = f": {_listed(sources)} {leave} it open" if sources else ""
    return f"The equations have no single answer for the level{where}{who}.", sources, list(nets)


def _listed(names: Sequence[str]) -> str:
    return ", ".join(names[:-1]) + (" and " if len(names) > 1 else "") + names[-1]
