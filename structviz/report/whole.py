"""A folder written whole or not at all.

Everything goes into a new folder beside the target, which takes the target's place in one step when it is complete. Until
then what was there stays as it was, whatever stops the work: an error, an interrupt, a full disk, the end of the process.
"""

from __future__ import annotations

import ctypes
import errno
import os
import secrets
import shutil
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path

from structviz.errors import OutputError
from structviz.report.names import printable

if sys.platform != "win32":
    import fcntl

LITTER = {".DS_Store", "Thumbs.db", "desktop.ini"}  # left by file browsers, missed by nobody
PARTIAL, OLD = ".partial", ".old"
HERE, EXCHANGE = -100, 2  # AT_FDCWD and RENAME_EXCHANGE of Linux; RENAME_SWAP of macOS is 2 as well


def checked_target(folder: str | os.PathLike[str], earlier: Callable[[Path], set[str]], ours: str) -> Path:
    """Return the folder as a full path; OutputError where results may not be put there. Nothing is written.

    `earlier` gives the files, relative to a folder, that an earlier result in it is made of, none where there is no such
    result; `ours` names such a result in words. Only these files may be in the folder.
    """
    shown = printable(os.fspath(folder))
    try:
        target = Path(folder).resolve()
        is_folder, exists = target.is_dir(), os.path.lexists(target)
        held = {entry.name for entry in target.iterdir()} - LITTER if is_folder else set()
    except (OSError, ValueError, RuntimeError) as error:  # ValueError: a null in the name; RuntimeError: a loop of links
        raise failed(shown, error) from None
    if exists and not is_folder:
        raise OutputError(f"{shown}: found a file; wanted a folder", hint="name a folder that does not exist yet")
    above = next(place for place in target.parents if os.path.lexists(place))
    if not above.is_dir():
        raise failed(shown, NotADirectoryError(errno.ENOTDIR, "part of the path is a file"))
    if not os.access(above, os.W_OK):
        raise failed(shown, PermissionError(errno.EACCES, os.strerror(errno.EACCES)))
    if target == Path.cwd():
        raise OutputError(f"{shown}: found the folder you are in; wanted one of its own", hint="name a folder in it, such as --out results")
    if held:
        _refuse_strangers(shown, target, held, earlier(target), ours)
    return target


def _refuse_strangers(shown: str, target: Path, held: set[str], known: set[str], ours: str) -> None:
    """Raise OutputError where a folder holds anything but an earlier result."""
    strangers = sorted(all_files(target) - known) if known else sorted(held)
    if not strangers:
        return
    names = ", ".join(printable(name, 60) for name in strangers[:3]) + (f" and {len(strangers) - 3} more" if len(strangers) > 3 else "")
    wanted = f"an empty folder, or one that holds only {ours}"
    raise OutputError(f"{shown}: found other files ({names}); wanted {wanted}", hint="name another folder, or move those files away")


def all_files(target: Path) -> set[str]:
    """Return every file below a folder, relative to it, with forward slashes; links count as files and are not followed."""
    found = set()
    for place, folders, files in os.walk(target):
        links = [name for name in folders if os.path.islink(os.path.join(place, name))]
        empty = [] if files or folders or Path(place) == target else ["."]
        found |= {Path(place, name).relative_to(target).as_posix() for name in [*files, *links, *empty] if name not in LITTER}
    return found


@contextmanager
def complete_or_nothing(target: Path) -> Iterator[Path]:
    """Give a new folder beside the target, and put it in the target's place if all goes well; else leave everything as it was.

    Raises OutputError where the system refuses.
    """
    made: list[Path] = []
    new = target.with_name(f".{target.name[:30]}.{secrets.token_hex(4)}{PARTIAL}")
    try:
        _make_parents(target.parent, made)
        _sweep(target)
        new.mkdir()
        with _claimed(new):
            yield new
            _swap(new, target)
    except (OSError, OutputError) as error:
        _undo(new, made)
        said = error.__context__ if isinstance(error, OutputError) else error  # not the name of a folder that is gone
        raise failed(printable(str(target)), said or error) from error
    except BaseException:  # an interrupt, too, must leave nothing half done
        _undo(new, made)
        raise


@contextmanager
def _claimed(folder: Path) -> Iterator[None]:
    """Hold a lock on a folder, which the system lets go when the process ends, however it ends."""
    if sys.platform == "win32":
        yield
        return
    held = os.open(folder, os.O_RDONLY)
    try:
        with suppress(OSError):  # some network disks know no locks: then nothing there is ever swept
            fcntl.flock(held, fcntl.LOCK_EX | fcntl.LOCK_NB)
        yield
    finally:
        os.close(held)


def _sweep(target: Path) -> None:
    """Remove what runs that were killed left beside the target: folders of ours that no process holds any more."""
    if sys.platform == "win32":
        return
    for left in target.parent.glob(f".{_plain(target.name[:30])}.{'[0-9a-f]' * 8}*"):
        if left.suffix not in (PARTIAL, OLD) or left.is_symlink() or not left.is_dir():
            continue
        with suppress(OSError):
            held = os.open(left, os.O_RDONLY)
            try:
                fcntl.flock(held, fcntl.LOCK_EX | fcntl.LOCK_NB)  # OSError where a run still works on it
                shutil.rmtree(left, ignore_errors=True)
            finally:
                os.close(held)


def _plain(name: str) -> str:
    """Return a name that a pattern takes letter by letter."""
    return "".join(f"[{letter}]" if letter in "[]*?" else letter for letter in name)


def _make_parents(parent: Path, made: list[Path]) -> None:
    missing = [place for place in (parent, *parent.parents) if not place.exists()]
    for place in reversed(missing):
        place.mkdir()
        made.append(place)


def _undo(new: Path, made: Sequence[Path]) -> None:
    shutil.rmtree(new, ignore_errors=True)
    for place in reversed(made):
        try:
            place.rmdir()
        except OSError:  # something else was put there meanwhile: leave it
            return


def _swap(new: Path, target: Path) -> None:
    """Put the new folder in the place of the old one, which goes only after that."""
    if not target.exists():
        new.rename(target)
        return
    if _exchanged(new, target):
        shutil.rmtree(new, ignore_errors=True)
        return
    old = new.with_suffix(OLD)
    target.rename(old)
    try:
        new.rename(target)
    except BaseException:
        old.rename(target)
        raise
    shutil.rmtree(old, ignore_errors=True)


def _exchanged(one: Path, other: Path) -> bool:
    """Return True where the system has let two folders trade places in one step, False where it cannot.

    With two steps, a process killed between them would leave nothing under the name of the target.
    """
    names = os.fsencode(one), os.fsencode(other)
    try:
        library = ctypes.CDLL(None)
        if sys.platform == "darwin":
            return library.renamex_np(*names, EXCHANGE) == 0
        return library.renameat2(HERE, names[0], HERE, names[1], EXCHANGE) == 0
    except (AttributeError, OSError, TypeError):
        return False


def failed(shown: str, error: BaseException) -> OutputError:
    """Return the OutputError that tells what the system said, with what to do about it."""
    number = getattr(error, "errno", None)
    hints = {
        errno.ENOSPC: "free some space on that disk, or name a folder on another",
        errno.EDQUOT: "your share of that disk is used up: free some space or name a folder on another",
        errno.EACCES: "name a folder you may write to",
        errno.EPERM: "name a folder you may write to",
        errno.EROFS: "that disk can only be read: name a folder on another",
        errno.ENOTDIR: "name a folder below an existing one",
        errno.ENAMETOOLONG: "choose a shorter name",
        errno.EBUSY: "the folder itself cannot be replaced (a mounted disk?): name a folder in it",
    }
    said = getattr(error, "strerror", None) or str(error)
    return OutputError(f"{shown}: cannot be written ({said}); nothing was changed", hint=hints.get(number or 0, "name another folder"))
