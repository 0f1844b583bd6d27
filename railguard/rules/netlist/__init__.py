"""Netlist: the reading itself, and what is odd about the circuit that was read."""
