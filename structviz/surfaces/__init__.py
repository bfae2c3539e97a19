"""Triangulated surfaces: what was read, how it is measured, where stations lie, how far surfaces are apart."""
