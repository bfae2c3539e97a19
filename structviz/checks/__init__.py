"""Checks: a limit and its wording over the maths below. `run` runs them all; `CHECKS` is the table.

Every module of this folder is loaded, so a new file of checks needs no entry anywhere else.
"""

from __future__ import annotations

from importlib import import_module
from pkgutil import iter_modules

from structviz.checks.registry import CHECKS, Check, Examined, Found, check, checked_limits, run, table_text

__all__ = ["CHECKS", "Check", "Examined", "Found", "check", "checked_limits", "run", "table_text"]

for _module in sorted(entry.name for entry in iter_modules(__path__)):
    import_module(f"{__name__}.{_module}")
