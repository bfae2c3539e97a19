"""`structviz COMMAND ...`: finds the command, loads only its module, and turns every outcome into an exit code.

Exit codes: 0 nothing conflicts, 1 conflicts found, 2 unusable input or usage, 3 a fault of structviz, 130 interrupted.
"""

from __future__ import annotations

import argparse
import difflib
import os
import sys
from collections.abc import Sequence
from importlib import import_module
from typing import NoReturn, Protocol, cast

from structviz._version import __version__
from structviz.errors import ArgumentError, StructvizError

OK, CONFLICTS, UNUSABLE, FAULT, INTERRUPTED = 0, 1, 2, 3, 130

# A command is a module of structviz.cli with `add_arguments` and `run`; the line is what `structviz --help` shows.
COMMANDS = {
    "check": "judge the declared movement of every fault of a model by all the others",
    "checks": "list what is checked, why, and from which limit on",
    "inspect": "list the surfaces in files with size, orientation and condition; propose a table of faults",
    "convert": "write the surfaces of a model in another format, and say what it cannot keep",
    "repair": "mend surfaces into a new folder, with a log of every change",
    "figures": "draw the figures of a report in print quality, with captions",
    "formats": "list the file formats that can be read and written",
    "view": "show a model or its results in a window",
    "serve": "show the page of a model in the browser, and keep it up to date",
}
EPILOG = """\
start with:  structviz check FOLDER_OR_FILE --out results
exit codes:  0 nothing conflicts, 1 conflicts found, 2 input or usage that cannot be used"""


class Command(Protocol):
    """What a module of a command offers."""

    __doc__: str | None

    def add_arguments(self, parser: argparse.ArgumentParser) -> None:
        """Add the command's own arguments."""

    def run(self, args: argparse.Namespace) -> int:
        """Do the work and return the exit code."""


class Parser(argparse.ArgumentParser):
    """An argument parser that raises ArgumentError instead of printing and leaving."""

    def error(self, message: str) -> NoReturn:
        """Raise ArgumentError with what was seen, in our words."""
        unknown = message.removeprefix("unrecognized arguments: ")
        missing = message.removeprefix("the following arguments are required: ")
        if unknown != message:
            near = difflib.get_close_matches(unknown.split()[0], self._option_string_actions, n=1)
            offer = f"did you mean {near[0]}? " if near else ""
            raise ArgumentError(f"found {unknown}, which {self.prog} does not know", hint=f"{offer}{self.prog} --help lists what it takes")
        text = f"{missing} is missing" if missing != message else message
        raise ArgumentError(f"{self.prog}: {text}", hint=f"{self.prog} --help lists what it takes")


def entry(argv: Sequence[str] | None = None) -> int:
    """Return the exit code of a command line; every message goes to standard error, every result to standard output."""
    arguments = list(sys.argv[1:] if argv is None else argv)
    # Our arrays are many and short: threads inside one product cost more than they save. Must be set before NumPy is loaded.
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    _tolerate_any_text()
    try:
        code = _dispatch(arguments)
        sys.stdout.flush()
        return code
    except StructvizError as error:
        return _say(f"structviz: {str(error).removeprefix('structviz: ')}", UNUSABLE)
    except BrokenPipeError:  # the reader of our output has left, as `| head` does: that is its right
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return OK
    except KeyboardInterrupt:
        return _say("structviz: interrupted; nothing was left half written", INTERRUPTED)
    except Exception as error:
        if "--debug" in arguments:
            raise
        return _say(_fault_text(error), FAULT)


def _dispatch(arguments: list[str]) -> int:
    """Return the exit code of a command, or of the help where none is named."""
    general = _general_parser()
    name = next((word for word in arguments if not word.startswith("-")), None)
    if name is None or not arguments or arguments[0] != name:
        general.parse_args(arguments)  # --help and --version leave here
        general.print_help()
        return OK
    if name not in COMMANDS:
        raise _unknown(name)
    command = cast(Command, import_module(f"structviz.cli.{name}"))
    parser = Parser(
        prog=f"structviz {name}", description=command.__doc__, allow_abbrev=False, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    command.add_arguments(parser)
    parser.add_argument("--debug", action="store_true", help="show the Python traceback of a fault of structviz")
    return command.run(parser.parse_args(arguments[1:]))


def _general_parser() -> Parser:
    lines = "\n".join(f"  {name:<9} {text}" for name, text in COMMANDS.items())
    about = "Could the faults of a 3D model have moved as it says, under one stress?"
    parser = Parser(
        prog="structviz", usage="structviz COMMAND ... | --help | --version", description=f"{about}\n\ncommands:\n{lines}", epilog=EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False,
    )  # fmt: skip
    parser.add_argument("--version", action="version", version=f"structviz {__version__}")
    return parser


def _unknown(name: str) -> ArgumentError:
    if os.path.exists(name):
        hint = f"to check a model: structviz check {name}"
    else:
        near = difflib.get_close_matches(name, COMMANDS, n=1)
        hint = f"did you mean 'structviz {near[0]}'?" if near else "structviz --help lists the commands"
    return ArgumentError(f"found the command {name!r}; wanted one of {', '.join(COMMANDS)}", hint=hint)


def _fault_text(error: Exception) -> str:
    what = f"{type(error).__name__}: {error}"
    return f"structviz: this is a fault of structviz, not of your input: {what}\n  next: run it again with --debug and report what it shows"


def _say(text: str, code: int) -> int:
    """Print a message to standard error, free of terminal escapes, and return the code."""
    clean = "".join(letter if letter.isprintable() or letter in "\n" else "\ufffd" for letter in text)
    print(clean, file=sys.stderr)
    return code


def _tolerate_any_text() -> None:
    """Let a terminal that lacks a letter show a mark in its place instead of ending the program."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")
