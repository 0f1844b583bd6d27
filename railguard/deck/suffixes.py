"""How the names of netlists and of what they include usually end, in lower case."""

NETLISTS = (".cir", ".ckt", ".net", ".nsx", ".sp", ".spi", ".spice")
"""What schematic editors and simulators call a deck."""

LIBRARIES = (".inc", ".lib", ".mdl", ".mod", ".model", ".sub", ".subckt")
"""What is included rather than reviewed by itself."""
