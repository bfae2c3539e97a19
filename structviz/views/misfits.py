"""The histogram of misfits as data: angles from declared to predicted slip, each fault a block, by verdict."""

from __future__ import annotations

from dataclasses import dataclass

from structviz.analysis import Analysis
from structviz.views.captions import DEPTH

BIN_DEG = 15.0
COLUMNS = int(180 / BIN_DEG)


@dataclass(frozen=True)
class MisfitBlock:
    """One fault in its column."""

    row: int  # of Analysis.faults
    name: str
    verdict: str
    misfit_deg: float
    column: int  # angles from column * BIN_DEG on
    level: int  # blocks below it


@dataclass(frozen=True)
class Misfits:
    """The whole histogram; empty where no declared slip could be compared."""

    blocks: tuple[MisfitBlock, ...]  # by column, from the bottom up
    highest: int  # blocks in the highest column


def build_misfits(analysis: Analysis) -> Misfits:
    """Return the histogram of the faults whose declared slip could be compared with a predicted one."""
    columns: list[list[tuple[int, str, str, float]]] = [[] for _ in range(COLUMNS)]
    for row, result in enumerate(analysis.faults):
        misfit = result.verdict.misfit_deg
        if misfit is not None:
            columns[min(int(misfit // BIN_DEG), COLUMNS - 1)].append((row, result.fault.name, result.verdict.word, misfit))
    blocks = tuple(
        MisfitBlock(*block, number, level)
        for number, column in enumerate(columns)
        for level, block in enumerate(sorted(column, key=lambda block: DEPTH[block[2]]))
    )
    return Misfits(blocks, max(map(len, columns)))
