"""How faults move: declared senses, slip resolved from a stress."""
