"""ngspice: writing cards out, running it, reading what it worked out."""
