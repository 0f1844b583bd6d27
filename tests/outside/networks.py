"""The worked examples' circuits as solved networks, for what no stage carries as a number."""

import numpy as np

from railguard.analysis.margins import known_parasitics
from railguard.analysis.network import Network
from railguard.analysis.recognise import keeps_closed, recognise
from railguard.analysis.signals import prepare
from railguard.analysis.solve import factor, return_ratios
from railguard.analysis.supplies import feeds, supply_nets
from railguard.circuit.flatten import flatten
from railguard.deck.files import deck_from_text
from railguard.devices import catalogue
from railguard.settings.file import parse


class Solved:
    """A deck's network with its devices' figures; levels, responses, resistances."""

    def __init__(self, cards, settings, supply):
        stated = parse(settings, "t.toml")
        devices = catalogue.load(stated.devices)
        deck = deck_from_text(f"worked example\n{cards}\n{supply}.end\n")
        circuit = flatten(deck, keeps_closed(devices))
        self.amplifiers = recognise(circuit, devices, stated).amplifiers
        fed = feeds(supply_nets(self.amplifiers), circuit.elements, stated, self.amplifiers)
        self.prepared = prepare(circuit.elements, stated, fed)
        self.network = Network(
            self.prepared.elements, self.amplifiers, extra=known_parasitics(self.amplifiers)
        )

    def level(self, net):
        """Return a net's DC level, V."""
        drives = [(d.injection, complex(d.value)) for d in self.prepared.levels]
        x = factor(self.network, 0.0).forward(self.network.right_hand_side(drives))
        return float(x[self.network.row(net)].real)

    def gain(self, source, net, hertz):
        """Return the complex gain from a source to a net at a frequency."""
        b = self.network.right_hand_side([(source, 1.0)])
        return complex(factor(self.network, hertz).forward(b)[self.network.row(net)])

    def resistance(self, net):
        """Return the resistance that a net shows at DC, ohm."""
        row = self.network.row(net)
        return float(factor(self.network, 0.0).adjoint([row])[0, row].real)

    def input_resistance(self, source):
        """Return what a voltage source works into at DC, ohm."""
        row = self.network.injections[source].row
        # The branch current counts into the source's first net from outside.
        return float(-1.0 / factor(self.network, 0.0).adjoint([row])[0, row].real)

    def loop_gain(self, hertz=0.0):
        """Return the first amplifier's loop transmission."""
        return complex(return_ratios(self.network, np.array([hertz]))[0, 0])

    def unlimited(self, source, net, hertz):
        """Return the gain that the feedback network alone gives: A (1 + 1/T).

        What an op-amp without end would make of it, at the loop transmission T of the real one
        (H. W. Bode's return ratio, from memory; what passes the op-amp by is left out).
        """
        return self.gain(source, net, hertz) * (1 + 1 / self.loop_gain(hertz))

    def corner(self, source, net, start, stop):
        """Return where the magnitude passes 0.7071 of the larger of its values at two frequencies."""
        ends = [abs(self.gain(source, net, f)) for f in (start, stop)]
        target = max(ends) / np.sqrt(2)
        rising = ends[1] > ends[0]
        low, high = start, stop
        for _ in range(60):
            middle = np.sqrt(low * high)
            below = abs(self.gain(source, net, middle)) < target
            low, high = (middle, high) if below == rising else (low, middle)
        return float(np.sqrt(low * high))
