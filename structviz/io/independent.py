"""What was measured apart from the faults, added to a model: mechanisms of earthquakes, azimuths from wells."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from structviz.io.ledger import Ledger, content_of
from structviz.io.mechanisms import read_mechanisms
from structviz.io.shmax import read_azimuths
from structviz.io.units import Frame
from structviz.model import FaultModel


def with_measurements(
    model: FaultModel, mechanisms: str | Path = "", well_azimuths: str | Path = "", mechanisms_are: str = "independent"
) -> FaultModel:
    """Return the model with the mechanisms and the azimuths of the files named in place of its own, "" to keep those.

    Places in the files are in metres. The files may lie anywhere: they are named by whoever calls, not by the model.
    Raises InputError (TableError, FormatError).
    """
    if mechanisms:
        model = added(model, Path(mechanisms), mechanisms_are)
    return added(model, Path(well_azimuths)) if well_azimuths else model


def added(model: FaultModel, path: Path, mechanisms_are: str = "") -> FaultModel:
    """Return the model with what one file holds, mechanisms where it is said what they are, else azimuths."""
    ledger = Ledger(path.parent)
    model = with_file(model, ledger, path, Frame(), mechanisms_are)
    return replace(model, inputs=(*model.inputs, *ledger.input_files()), findings=(*model.findings, *ledger.findings))


def with_file(model: FaultModel, ledger: Ledger, path: Path, frame: Frame, mechanisms_are: str = "") -> FaultModel:
    """Return the model with what one file holds; what should be told goes to the ledger."""
    content, shown = content_of(ledger, path), ledger.shown(path)
    if mechanisms_are:
        mechanisms, told = read_mechanisms(content, shown, frame)
        model = replace(model, mechanisms=mechanisms, mechanisms_are=mechanisms_are)
    else:
        azimuths, told = read_azimuths(content, shown, frame)
        model = replace(model, azimuths=azimuths)
    for message in told:
        ledger.note("model", message)
    return model
