"""The choices that `check` and `serve` share: where else to read from, the limits of checks, and every setting."""

from __future__ import annotations

import argparse
import signal
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import Field, fields
from types import FrameType
from typing import Any

from structviz.checks import checked_limits
from structviz.errors import ArgumentError
from structviz.settings import Settings, bounds


def add_choices(parser: argparse.ArgumentParser) -> None:
    """Add the options that say how a model is read and judged, one for each setting among them."""
    parser.add_argument("--allow-outside", action="store_true", help="let the model use files outside its own folder")
    parser.add_argument(
        "--where",
        action="append",
        default=[],
        metavar="NAME=VALUE",
        help="of traces, keep those with this property (repeatable; several values parted by commas)",
    )
    parser.add_argument("--mechanisms", metavar="FILE", default="", help="compare with earthquake mechanisms (CSV, or QuakeML by ObsPy)")
    parser.add_argument("--well-azimuths", metavar="FILE", default="", help="compare with SHmax azimuths measured in wells (CSV)")
    parser.add_argument(
        "--limit",
        action="append",
        default=[],
        metavar="KEY=VALUE",
        help="change the limit of a check (repeatable); structviz checks lists them",
    )
    group = parser.add_argument_group("settings")
    for item in fields(Settings):
        group.add_argument(option(item.name), metavar="N", help=_help(item))


def option(name: str) -> str:
    """Return the option of a setting.

    >>> option("friction_angle_deg")
    '--friction-angle-deg'
    """
    return "--" + name.replace("_", "-")


def _help(item: Field) -> str:
    known = item.metadata
    return f"{known['help']} ({bounds(item)}; default {item.default:g})".replace("%", "%%")


def settings_of(args: argparse.Namespace) -> Settings:
    """Return the settings with those given replaced; ArgumentError where a value is no number or out of range."""
    chosen: dict[str, Any] = {}
    for item in fields(Settings):
        text = getattr(args, item.name)
        if text is not None:
            chosen[item.name] = number(text, option(item.name), whole=isinstance(item.default, int))
    return Settings(**chosen)


def where_of(given: Sequence[str]) -> dict[str, str]:
    """Return properties and their wanted values; ArgumentError for a text without =."""
    found = {}
    for text in given:
        key, equals, value = text.partition("=")
        if not equals or not key.strip():
            raise ArgumentError(f"--where: found {text!r}; wanted NAME=VALUE", hint="name a property of the traces and its value")
        found[key.strip()] = value.strip()
    return found


def limits_of(given: Sequence[str]) -> dict[str, float]:
    """Return the limits by key; ArgumentError for a text without =, a value that is no number, an unknown key."""
    limits: dict[str, float] = {}
    for text in given:
        key, found, value = text.partition("=")
        if not found:
            raise ArgumentError(f"--limit: found {text!r}; wanted KEY=VALUE", hint="structviz checks lists the keys")
        limits[key.strip()] = float(number(value, f"--limit {key.strip()}", whole=False))
    checked_limits(limits)
    return limits


def number(text: str, where: str, *, whole: bool) -> float | int:
    """Return the number a text says; ArgumentError where it says none."""
    try:
        return int(text) if whole else float(text)
    except ValueError:
        wanted = "a whole number" if whole else "a number"
        raise ArgumentError(f"{where}: found {text!r}; wanted {wanted}", hint="structviz check --help lists the settings") from None


@contextmanager
def ending_like_an_interrupt() -> Iterator[None]:
    """Let a request to end (SIGTERM) clean up as an interrupt does, where the system allows it."""

    def stop(number: int, frame: FrameType | None) -> None:
        raise KeyboardInterrupt

    try:
        before = signal.signal(signal.SIGTERM, stop)
    except ValueError:  # not in the main thread
        yield
        return
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)
