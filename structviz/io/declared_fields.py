"""What a mesh file itself says of how its fault moved, made into a fault, and told."""

from __future__ import annotations

from collections.abc import Sequence

from structviz.errors import TableError
from structviz.io.format import Piece
from structviz.io.ledger import Ledger
from structviz.io.tables import Row, declared, down_side
from structviz.model import Fault
from structviz.surfaces.surface import Surface


def fault_in_file(ledger: Ledger, name: str, file: str, piece: Piece, surface: Surface) -> Fault:
    """Return a fault with the movement its own file declares; what was taken, or could not be, is noted."""
    if not piece.declared:
        return Fault(name, surface)
    row = Row(file, name, dict(piece.declared))
    try:
        sector, side = declared(row), down_side(row)
    except TableError as error:
        hint = "give a faults.csv that says how it moved"
        ledger.note(name, f"what {file} says of its movement is not used: found {error.found}; wanted {error.wanted}", hint, "warning")
        return Fault(name, surface, None, row.text("phase"))
    ledger.note(name, f"taken from {file}: {_words(piece)}", "give a faults.csv to say otherwise")
    return Fault(name, surface, sector, row.text("phase"), side)


def note_unused(ledger: Ledger, row: Row, name: str, pieces: Sequence[Piece]) -> None:
    """Note what its files declare of a fault where its row in the table says nothing: the table decides, but may not be finished."""
    if row.text("sense") or row.text("rake_deg"):
        return
    for piece in pieces:
        if piece.declared.get("sense") or piece.declared.get("rake_deg"):
            said = f"its file says {_words(piece)}; the table of faults says nothing, which is followed"
            ledger.note(name, said, "fill it in if it is so")


def _words(piece: Piece) -> str:
    return ", ".join(f"{column} {value}" for column, value in piece.declared.items())
