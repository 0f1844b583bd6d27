"""Structure: expressions, parameters, flattening, elements, sources, nets."""
