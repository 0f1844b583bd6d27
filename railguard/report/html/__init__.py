"""The HTML page: one self-contained file with drawings, rail scales, loops and the netlist."""
