"""Knowledge: the op-amp catalogue, matching of names, pin-outs. Knows no circuit."""
