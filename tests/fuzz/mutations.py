"""Damage for files: bytes changed, cut, repeated, swapped; numbers made absurd; the insides of archives damaged and packed again."""

from __future__ import annotations

import io
import random
import re
import zipfile
import zlib
from collections.abc import Callable

TOKENS = (
    b"", b"\0", b"\xff", b"-1", b"0", b"1e308", b"-1e-308", b"nan", b"inf", b"9999999999999", b"4294967295", b"2147483648",
    b"18446744073709551616", b"\n", b"\r", b" ", b",", b";", b'"', b"'", b"<", b">", b"/", b"..", b"../../x", b"&#0;", b"&lt;", b"{", b"}",
    b"[", b"]", b"\xef\xbb\xbf", b"\xed\xa0\x80", b"\x1b[31m", b"%s", b"=1+1", b"#", b"<!DOCTYPE a [<!ENTITY b 'c'>]>", b"1" * 400,
)  # fmt: skip
NUMBER = re.compile(rb"-?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?")
MOST_INSIDE = 1 << 20  # archives are packed again only from members this small

Mutation = Callable[[bytes, random.Random], bytes]


def flipped(content: bytes, chance: random.Random) -> bytes:
    """Return the content with one to eight bytes replaced."""
    out = bytearray(content)
    for _ in range(chance.randint(1, 8)):
        if out:
            out[_place(out, chance)] = chance.randrange(256)
    return bytes(out)


def cut(content: bytes, chance: random.Random) -> bytes:
    """Return only the beginning."""
    return content[: _place(content, chance)]


def spliced(content: bytes, chance: random.Random) -> bytes:
    """Return the content with a piece taken out, repeated or moved."""
    if not content:
        return content
    start = _place(content, chance)
    piece = content[start : start + chance.choice([1, 4, 16, 64, 256])]
    to = _place(content, chance)
    if chance.random() < 0.3:
        return content[:start] + content[start + len(piece) :]
    return content[:to] + piece * chance.choice([1, 1, 2, 20]) + content[to:]


def tokened(content: bytes, chance: random.Random) -> bytes:
    """Return the content with some words put in or in the place of others."""
    out = content
    for _ in range(chance.randint(1, 3)):
        place = _place(out, chance)
        out = out[:place] + chance.choice(TOKENS) + out[place + chance.choice([0, 1, 2, 4, 8]) :]
    return out


def renumbered(content: bytes, chance: random.Random) -> bytes:
    """Return the content with some numbers of its text replaced; of a binary file, with a run of its bytes replaced by one."""
    found = list(NUMBER.finditer(content[:200_000]))
    if not found or content[:200].count(b"\0") > 20:
        if len(content) < 8:
            return content
        place = _place(content, chance)
        new = chance.choice([b"\xff" * 4, b"\0" * 4, b"\xff" * 8, b"\xff\xff\xff\x7f", b"\0\0\xc0\x7f", b"\0\0\x80\x7f", b"\1\0\0\0"])
        return content[:place] + new + content[place + len(new) :]
    out = content
    chosen = chance.sample(found, min(len(found), chance.randint(1, 3)))
    for match in sorted(chosen, key=lambda m: -m.start()):
        near = match.group() + b"0", b"-" + match.group()
        new = chance.choice([b"-1", b"0", b"1", b"1e308", b"nan", b"99999999999", b"4294967296", b"0.5", *near])
        out = out[: match.start()] + new + out[match.end() :]
    return out


def lines_shuffled(content: bytes, chance: random.Random) -> bytes:
    """Return the content with two of its lines swapped, or one dropped or repeated."""
    lines = content.split(b"\n")
    a, b = chance.randrange(len(lines)), chance.randrange(len(lines))
    what = chance.randrange(3)
    if what == 0:
        lines[a], lines[b] = lines[b], lines[a]
    elif what == 1:
        del lines[a]
    else:
        lines.insert(b, lines[a])
    return b"\n".join(lines)


PLAIN: tuple[Mutation, ...] = (flipped, cut, spliced, tokened, renumbered, lines_shuffled)


def repacked(content: bytes, chance: random.Random) -> bytes:
    """Return an archive with one of its members damaged, renamed or dropped, packed again so that its checksums agree."""
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            members = [(info.filename, archive.read(info)) for info in archive.infolist() if info.file_size < MOST_INSIDE]
    except (zipfile.BadZipFile, zlib.error, OSError, EOFError, RuntimeError, KeyError, ValueError):
        return flipped(content, chance)
    if not members:
        return content
    number = chance.randrange(len(members))
    name, inside = members[number]
    what = chance.random()
    if what < 0.1:
        del members[number]
    elif what < 0.2:
        members[number] = (chance.choice(["../../x", "/etc/x", "a\\..\\b", name.upper(), name + "/x", "x" * 300]), inside)
    else:
        members[number] = (name, chance.choice(PLAIN)(inside, chance))
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as archive:
        for member, data in members:
            archive.writestr(zipfile.ZipInfo(member), data)
    return out.getvalue()


def mutated(content: bytes, chance: random.Random) -> bytes:
    """Return the content damaged once or twice."""
    ways: tuple[Mutation, ...] = (repacked,) * 4 + PLAIN if content.startswith(b"PK\x03\x04") else PLAIN
    for _ in range(chance.choice([1, 1, 1, 2])):
        content = chance.choice(ways)(content, chance)
    return content


def _place(content: bytes | bytearray, chance: random.Random) -> int:
    """Return a place, more often near the beginning, where counts and types stand."""
    if not content:
        return 0
    return chance.randrange(min(len(content), chance.choice([64, 400, 2000, len(content)])))
