"""Every error structviz raises on purpose. Each carries a hint: what to do next.

StructvizError
|- InputError            a file or folder cannot be used (exit code 2)
|  |- FormatError        no reader knows the file, or its content belies its name
|  |- TableError         a row, column or word of a table or model file is wrong
|  `- SurfaceError       a surface has nothing that can be measured
|- ArgumentError         a value given from Python or the command line is out of range (also a ValueError)
|- OutputError           results could not be written; what was there before is untouched
`- RenderingUnavailable  no working OpenGL: pictures are skipped, numbers are not
"""

from __future__ import annotations


class StructvizError(Exception):
    """Base of all errors raised on purpose; `hint` says what to do next."""

    def __init__(self, message: str, *, hint: str = "") -> None:
        super().__init__(message)
        self.message = message
        self.hint = hint

    def __str__(self) -> str:
        return f"{self.message}\n  next: {self.hint}" if self.hint else self.message


class InputError(StructvizError):
    """An input cannot be used: which file, what was found, what was wanted, what to do next."""

    def __init__(self, file: object, found: str, wanted: str, *, hint: str) -> None:
        super().__init__(f"{file}: found {found}; wanted {wanted}", hint=hint)
        self.file = str(file)
        self.found = found
        self.wanted = wanted


class FormatError(InputError):
    """No reader knows the file, or its content belies its name."""


class TableError(InputError):
    """A row, column or word of a table or model file is wrong."""


class SurfaceError(InputError):
    """A surface has nothing that can be measured."""


class ArgumentError(StructvizError, ValueError):
    """A value given from Python or the command line is out of range."""


class OutputError(StructvizError):
    """Results could not be written; what was there before is untouched."""


class RenderingUnavailable(StructvizError):
    """No working OpenGL was found, so pictures cannot be drawn."""
