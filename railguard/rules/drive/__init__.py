"""Drive: the current and the power a load asks of an output, and what is joined to it."""
