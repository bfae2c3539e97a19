"""Checks: a limit and its wording over the maths below. `run` runs them all; `CHECKS` is the table."""

from __future__ import annotations
