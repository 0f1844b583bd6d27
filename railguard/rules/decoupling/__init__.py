"""Decoupling, judged per rail: a netlist knows no distance."""
