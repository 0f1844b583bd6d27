"""Words out: terminal and JSON, the rail scale. Prints what it is given, computes nothing."""
