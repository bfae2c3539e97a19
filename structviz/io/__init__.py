"""Reading and writing: fault models, surfaces, and the table of formats."""

from structviz.io.reading import read_model, read_surfaces
from structviz.io.registry import FORMATS
from structviz.io.writing import write_surface

__all__ = ["FORMATS", "read_model", "read_surfaces", "write_surface"]
