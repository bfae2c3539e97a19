"""Every registered format: what it writes it reads back, it is known by its content, and damage is an error with a reason."""

from __future__ import annotations

import random

import numpy as np
import pytest

from structviz.errors import ArgumentError, InputError
from structviz.io import FORMATS, read_surfaces, write_surface
from structviz.io.format import CELL_ARRAYS, FLOAT64, NAMES, OWN_LENGTH, SHARED_VERTICES
from structviz.io.ledger import read_pieces
from structviz.io.registry import format_of, table_text
from structviz.surfaces.surface import Surface

WRITABLE = [entry for entry in FORMATS if entry.write]
NAME = "Fault A/é <&>"


def bent_surface(name: str = NAME) -> Surface:
    """Return a bent sheet at UTM coordinates that float32 cannot hold, as a fixed random state gives it."""
    chance = np.random.default_rng(4)
    east, north = np.meshgrid(np.arange(6.0), np.arange(5.0))
    up = chance.normal(0, 0.3, east.size) - 4321.0
    vertices = np.stack([512345.678 + 100 * east.ravel(), 4123456.789 + 100 * north.ravel(), up], axis=1) + chance.normal(
        0, 1e-3, (east.size, 3)
    )
    corner = np.arange(east.size).reshape(east.shape)
    a, b, c, d = corner[:-1, :-1].ravel(), corner[:-1, 1:].ravel(), corner[1:, 1:].ravel(), corner[1:, :-1].ravel()
    return Surface(name, vertices, np.concatenate([np.stack([a, b, c], 1), np.stack([a, c, d], 1)]))


def id_of(entry) -> str:
    return entry.key


@pytest.mark.parametrize("entry", WRITABLE, ids=id_of)
class TestRoundTrip:
    def test_corners_come_back_to_the_last_bit_and_in_order(self, entry, tmp_path):
        surface = bent_surface()
        write_surface(tmp_path / f"a{entry.suffixes[0]}", surface, {})
        (back,) = read_surfaces(tmp_path / f"a{entry.suffixes[0]}")
        if FLOAT64 in entry.cannot_store:  # single precision is the least a format must keep
            off = np.abs(back.vertices[back.triangles] - surface.vertices[surface.triangles])
            assert (off <= np.spacing(np.abs(surface.vertices[surface.triangles]).astype(np.float32))).all()
        else:
            assert np.array_equal(back.vertices[back.triangles], surface.vertices[surface.triangles])
        assert back.vertices.dtype == np.float64
        assert back.triangles.dtype == np.int64
        assert np.array_equal(back.triangles, surface.triangles) != (SHARED_VERTICES in entry.cannot_store)
        assert back.history == ()

    def test_the_name_comes_back_unless_the_format_has_none(self, entry, tmp_path):
        write_surface(tmp_path / f"stem{entry.suffixes[0]}", bent_surface(), {})
        (back,) = read_surfaces(tmp_path / f"stem{entry.suffixes[0]}")
        assert back.name == ("stem" if NAMES in entry.cannot_store else NAME)

    def test_the_same_input_gives_the_same_bytes_and_is_left_alone(self, entry):
        surface = bent_surface()
        before = surface.vertices.tobytes(), surface.triangles.tobytes()
        assert entry.write(surface, {}) == entry.write(bent_surface(), {})
        assert (surface.vertices.tobytes(), surface.triangles.tobytes()) == before

    def test_cell_arrays_are_kept_or_refused(self, entry, tmp_path):
        surface, path = bent_surface(), tmp_path / f"a{entry.suffixes[0]}"
        cell_data = {"dip": np.arange(40.0), "verdict": np.array(["consistent", "conflicting"] * 20)}
        if CELL_ARRAYS in entry.cannot_store:
            with pytest.raises(ArgumentError, match="cannot hold values on triangles"):
                write_surface(path, surface, cell_data)
            assert not path.exists()
        else:
            write_surface(path, surface, cell_data)
            content = path.read_bytes()
            assert b"conflicting" in content or b"99 111 110 102 108 105 99 116 105 110 103 0" in content
            assert np.array_equal(read_surfaces(path)[0].triangles, surface.triangles)

    def test_only_its_own_sniff_knows_it(self, entry):
        content = entry.write(bent_surface(), {})
        assert [known.key for known in FORMATS if known.sniff(content)] == [entry.key]

    def test_another_suffix_is_read_by_content_and_told(self, entry, tmp_path):
        other = next(known for known in WRITABLE if known is not entry)
        path = tmp_path / f"a{other.suffixes[0]}"
        path.write_bytes(entry.write(bent_surface(), {}))
        (back,) = read_surfaces(path)
        assert len(back.triangles) == 40
        assert back.history == (f"named {other.suffixes[0]}, but its content is {entry.title}: read as that",)

    def test_cut_short_anywhere_it_is_an_error(self, entry):
        content = entry.write(bent_surface(), {})
        for length in range(0, len(content) - 60, max(1, len(content) // 200)):
            if OWN_LENGTH in entry.cannot_store and b"\nf " in content[:length]:
                break
            with pytest.raises(InputError):
                read_pieces(content[:length], f"cut{entry.suffixes[0]}")

    def test_damage_is_an_error_or_still_a_surface(self, entry):
        content, chance = entry.write(bent_surface(), {}), random.Random(7)
        for _ in range(300):
            damaged = bytearray(content)
            place = chance.randrange(min(len(damaged), chance.choice([200, len(damaged)])))
            damaged[place : place + chance.randrange(3)] = chance.choice([b"\xff", b"-1", b"nan", b"9999999999999", b"", b"\0\0\0\0"])
            try:
                pieces = read_pieces(bytes(damaged), f"a{entry.suffixes[0]}")
            except InputError:
                continue
            for piece in pieces:
                assert piece.triangles.min() >= 0
                assert piece.triangles.max() < len(piece.vertices)
                assert np.isfinite(piece.vertices).all()

    @pytest.mark.parametrize("value", [np.nan, np.inf])
    def test_coordinates_that_are_not_finite_are_refused(self, entry, value):
        surface = bent_surface()
        surface.vertices[7, 2] = value
        with np.errstate(invalid="ignore"), pytest.raises(InputError, match=rf"a{entry.suffixes[0]}.*found .*(nan|inf)"):
            read_pieces(entry.write(surface, {}), f"a{entry.suffixes[0]}")

    def test_no_triangles_is_an_error(self, entry):
        empty = Surface("x", np.zeros((3, 3)), np.zeros((0, 3), np.int64))
        with pytest.raises(InputError, match="wanted"):
            read_pieces(entry.write(empty, {}), f"a{entry.suffixes[0]}")

    def test_corners_outside_the_vertices_are_an_error(self, entry):
        if SHARED_VERTICES in entry.cannot_store:
            return
        surface = bent_surface()
        surface.triangles[3, 1] = 30
        with pytest.raises(InputError, match=r"corner number 3[01] in a triangle|nodes that are not in the file"):
            read_pieces(entry.write(surface, {}), f"a{entry.suffixes[0]}")


def test_formats_have_their_own_keys_and_suffixes():
    keys = [entry.key for entry in FORMATS]
    suffixes = [suffix for entry in FORMATS for suffix in entry.suffixes]
    assert len(set(keys)) == len(keys)
    assert len(set(suffixes)) == len(suffixes)
    assert all(suffix == suffix.lower() and suffix.startswith(".") for suffix in suffixes)
    assert {"vtp", "vtu", "vtk", "ply", "obj", "stl", "off", "msh"} <= set(keys)


def test_the_table_names_every_format_and_suffix():
    text = table_text()
    for entry in FORMATS:
        assert entry.title in text
        assert all(suffix in text for suffix in entry.suffixes)


@pytest.mark.parametrize(
    ("content", "found"),
    [
        (b"", "an empty file"),
        (b" \n\n", "only blanks"),
        (b"<!DOCTYPE html><html><body>not found</body></html>", r"a web page \(HTML\)"),
        (b"<?xml version='1.0'?><kml/>", "XML of another kind"),
        (b"PK\x03\x04" + bytes(100), "a ZIP archive"),
        (b"name,surface\na,b\n", "text that no reader knows"),
        (bytes(range(256)), "binary content that no reader knows"),
    ],
)
def test_unknown_content_is_described_and_the_formats_are_shown(content, found):
    with pytest.raises(InputError, match=rf"a\.vtp: found {found}; wanted VTK XML surface") as caught:
        format_of(content, "a.vtp")
    assert all(entry.title in str(caught.value) for entry in FORMATS)
