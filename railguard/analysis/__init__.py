"""Numbers: op-amps, supplies, signals, the linear solution, loops, corners, stages."""
