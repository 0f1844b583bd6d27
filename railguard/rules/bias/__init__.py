"""Bias: whether every input has a DC path, at a legal level, with small enough an error."""
