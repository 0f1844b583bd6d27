"""railguard: a design-rule checker for op-amp stages in SPICE netlists."""

__version__ = "0.1.0"
