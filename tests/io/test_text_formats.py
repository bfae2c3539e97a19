"""OBJ, STL, OFF and PLY: names, counting, polygons, mislabelled and damaged files."""

from __future__ import annotations

import struct

import numpy as np
import pytest

from structviz.errors import FormatError, InputError, SurfaceError
from structviz.io.ledger import read_pieces

CORNERS = "v 0 0 0\nv 1 0 0\nv 1 1 0\nv 0 1 0\n"


def obj(text):
    return read_pieces(text.encode(), "a.obj")


class TestObj:
    def test_each_object_and_group_is_one_surface_with_its_own_vertices(self):
        found = obj(f"# made by hand\no North\n{CORNERS}f 1 2 3\no South\nv 9 9 9\nf 1 3 5\nf 3 4 5\n")
        assert [(piece.name, len(piece.triangles), len(piece.vertices)) for piece in found] == [("North", 1, 3), ("South", 2, 4)]
        assert found[1].vertices[found[1].triangles[1]].tolist() == [[1, 1, 0], [0, 1, 0], [9, 9, 9]]

    def test_groups_without_objects_name_the_surfaces(self):
        assert [piece.name for piece in obj(f"{CORNERS}g east wing\nf 1 2 3\ng west\nf 1 3 4\n")] == ["east wing", "west"]

    def test_a_group_within_an_object_carries_both_names_and_default_is_none(self):
        found = obj(f"{CORNERS}o F\ng hanging\nf 1 2 3\ng default\nf 1 3 4\no G\nf 2 3 4\n")
        assert [piece.name for piece in found] == ["F:hanging", "F", "G"]

    def test_a_name_that_comes_again_goes_on(self):
        found = obj(f"{CORNERS}o A\nf 1 2 3\no B\nf 1 2 4\no A\nf 1 3 4\n")
        assert [(piece.name, len(piece.triangles)) for piece in found] == [("A", 2), ("B", 1)]

    def test_negative_numbers_count_back_from_the_vertices_read_so_far(self):
        (piece,) = obj("v 0 0 0\nv 1 0 0\nv 1 1 0\nf -3 -2 -1\nv 5 5 5\nf -4 -2 -1\n")
        assert piece.triangles.tolist() == [[0, 1, 2], [0, 2, 3]]

    def test_textures_tabs_continued_lines_and_dos_ends_are_passed_over(self):
        text = "v\t0 0 0\r\nv 1 0 0 0.5\r\nv 1 1 0 1 1 1\r\nv 0 1 0\r\nvn 0 0 1\r\nf 1/1/1 2//1 \\\r\n 3/2\r\nusemtl red\r\nf 1 3 4\r\n"
        (piece,) = obj(text)
        assert piece.triangles.tolist() == [[0, 1, 2], [0, 2, 3]]

    def test_polygons_are_fanned_and_told_for_the_part_they_are_in(self):
        one, two = obj(f"{CORNERS}o A\nf 1 2 3 4\no B\nf 1 2 3\n")
        assert one.triangles.tolist() == [[0, 1, 2], [0, 2, 3]]
        assert (one.history, two.history) == (("1 polygon split into triangles",), ())

    @pytest.mark.parametrize(
        ("faces", "message"),
        [
            ("f 1 2 9\n", "corner number 9 in a triangle; wanted 1 to 4"),
            ("f 0 1 2\n", "corner number 0 in a triangle; wanted 1 to 4"),
            ("f 1 2\n", "a face of 2 corners; wanted three corners or more"),
            ("f 1 2 x\n", "'x' among face corners; wanted whole numbers"),
            ("f 1 2 1.5\n", r"'1\.5' among face corners"),
            ("", "no cells; wanted a surface of triangles"),
            ("l 1 2\n", "only lines and points"),
            ("v 1 2\nf 1 2 3\n", r"a row of vertices with 2 numbers \('1 2'\)"),
            ("v 1 2 oops\nf 1 2 3\n", "'oops' among vertices; wanted numbers"),
        ],
    )
    def test_bad_rows_are_named(self, faces, message):
        with pytest.raises(InputError, match=rf"a\.obj: found {message}"):
            obj(CORNERS + faces)


FACET = "facet normal 0 0 1\nouter loop\nvertex 0 0 {0}\nvertex 1 0 {0}\nvertex 0 1 {0}\nendloop\nendfacet\n"


def binary_stl(head: bytes, count: int, corners) -> bytes:
    return (
        head.ljust(80, b"\0") + struct.pack("<I", count) + b"".join(struct.pack("<12fH", 0, 0, 1, *map(float, row), 0) for row in corners)
    )


class TestStl:
    def test_each_named_solid_is_one_surface(self):
        text = f"solid North fault\n{FACET.format(1)}endsolid North fault\nsolid South\n{FACET.format(2)}{FACET.format(3)}endsolid South\n"
        found = read_pieces(text.encode(), "a.stl")
        assert [(piece.name, len(piece.triangles)) for piece in found] == [("North fault", 1), ("South", 2)]
        assert found[1].vertices[:, 2].tolist() == [2, 2, 2, 3, 3, 3]

    def test_capitals_marks_and_line_ends_do_not_matter(self):
        text = f"\ufeffSOLID İstanbul\n{FACET.format(1).upper()}ENDSOLID\n".replace("\n", "\r")
        (piece,) = read_pieces(text.encode(), "a.stl")
        assert (piece.name, len(piece.triangles)) == ("İstanbul", 1)

    def test_text_keeps_float64(self):
        (piece,) = read_pieces(f"solid a\n{FACET.format('4123456.789012345')}endsolid\n".encode(), "a.stl")
        assert piece.vertices[0, 2] == 4123456.789012345

    def test_binary_that_begins_with_solid_is_read_as_binary(self):
        (piece,) = read_pieces(binary_stl(b"solid export facet", 1, [range(9)]), "a.stl")
        assert piece.vertices[piece.triangles[0]].tolist() == [[0, 1, 2], [3, 4, 5], [6, 7, 8]]
        assert piece.name == ""

    def test_coarse_coordinates_are_told(self):
        (piece,) = read_pieces(binary_stl(b"", 1, [[4.1e6] * 9]), "a.stl")
        assert piece.history == ("binary STL holds float32: coordinates are stepped by 0.25 this far from the origin",)

    def test_a_binary_file_cut_short_tells_both_lengths(self):
        with pytest.raises(FormatError, match="found 134 bytes, where its header promises 5 triangles in 334; wanted STL"):
            read_pieces(binary_stl(b"", 5, [range(9)]), "a.stl")

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            (f"solid a\n{FACET.format(0)}", "a solid that is not closed"),
            ("solid a\nendsolid a\n", "no facets"),
            (f"solid a\n{FACET.format('up')}endsolid\n", "'up' among vertices"),
            (
                "solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\nvertex 1 0 0\nendloop\nendfacet\nendsolid\n",
                "facets of another shape among the 1 of solid 'a'",
            ),
        ],
    )
    def test_bad_text_is_told(self, text, message):
        with pytest.raises(InputError, match=message):
            read_pieces(text.encode(), "a.stl")

    def test_no_triangles_is_an_error(self):
        with pytest.raises(SurfaceError, match="no triangles"):
            read_pieces(binary_stl(b"", 0, []), "a.stl")


class TestOff:
    def test_comments_colours_and_polygons(self):
        text = "COFF # a head\n# counts\n4 1 0\n0 0 0 255 0 0 1\n1 0 0 1 1 1 1\n\n1 1 0 1 1 1 1\n0 1 0 1 1 1 1\n4 0 1 2 3 0.5 0.5 0.5\n"
        (piece,) = read_pieces(text.encode(), "a.off")
        assert piece.triangles.tolist() == [[0, 1, 2], [0, 2, 3]]
        assert piece.history == ("1 polygon split into triangles",)

    def test_counts_may_stand_in_the_first_line(self):
        (piece,) = read_pieces(b"OFF 3 1 0\n0 0 0\n1 0 0\n0 1 0\n3 0 1 2\n", "a.off")
        assert piece.triangles.tolist() == [[0, 1, 2]]

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            ("OFF\n3 1 0\n0 0 0\n1 0 0\n", "2 rows; wanted 3 vertices and 1 faces"),
            ("OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 0\n3 0 1\n", "fewer corners than it says"),
            ("OFF\n3 1 0\n0 0 0\n1 0 0\n0 1 0\n3 0 1 3\n", "corner number 3"),
            ("OFF BINARY\n", "binary OFF; wanted OFF text"),
            ("OFF\n", "no counts"),
            ("OFF\n0 0 0\n", "no cells"),
        ],
    )
    def test_bad_files_are_told(self, text, message):
        with pytest.raises(InputError, match=message):
            read_pieces(text.encode(), "a.off")


HEAD = (
    "ply\nformat {0} 1.0\nelement vertex 4\nproperty {1} x\nproperty {1} y\nproperty {1} z\nelement face {2}\nproperty list uchar int {3}\n"
)
PLACES = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 4123456.789]])


def ply(order, faces, corners="vertex_indices"):
    """Return a PLY file of the four places in one of the three encodings."""
    head = (
        HEAD.format({"": "ascii", "<": "binary_little_endian", ">": "binary_big_endian"}[order], "double", len(faces), corners)
        + "end_header\n"
    )
    if not order:
        rows = [*(" ".join(map(repr, row)) for row in PLACES.tolist()), *(" ".join(map(str, [len(row), *row])) for row in faces)]
        return (head + "\n".join(rows) + "\n").encode()
    body = b"".join(struct.pack(f"{order}B{len(row)}i", len(row), *row) for row in faces)
    return head.encode() + PLACES.astype(order + "f8").tobytes() + body


@pytest.mark.parametrize("order", ["", "<", ">"])
class TestPly:
    def test_float64_is_kept(self, order):
        (piece,) = read_pieces(ply(order, [[0, 1, 2], [0, 2, 3]]), "a.ply")
        assert np.array_equal(piece.vertices, PLACES)
        assert piece.triangles.tolist() == [[0, 1, 2], [0, 2, 3]]

    def test_faces_of_mixed_size_are_split_in_order(self, order):
        (piece,) = read_pieces(ply(order, [[3, 1, 2], [0, 1, 2, 3]], "vertex_index"), "a.ply")
        assert piece.triangles.tolist() == [[3, 1, 2], [0, 1, 2], [0, 2, 3]]
        assert piece.history == ("1 polygon split into triangles",)

    def test_files_cut_short_name_the_rows(self, order):
        content = ply(order, [[0, 1, 2], [0, 2, 3]])
        with pytest.raises(FormatError, match="data that end within the face rows; wanted 2 rows of them"):
            read_pieces(content[:-3], "a.ply")
        with pytest.raises(FormatError, match="data that end within the vertex rows"):
            read_pieces(content[: content.find(b"end_header") + 25], "a.ply")

    def test_a_cloud_of_points_is_no_surface(self, order):
        with pytest.raises(SurfaceError, match="only lines and points"):
            read_pieces(ply(order, []), "a.ply")

    def test_corners_out_of_range_are_refused(self, order):
        with pytest.raises(FormatError, match=r"corner number 4 in a triangle; wanted 0 to 3 \(4 vertices\)"):
            read_pieces(ply(order, [[0, 1, 4]]), "a.ply")


def test_ply_strips_and_other_elements():
    head = "ply\nformat ascii 1.0\nelement note 1\nproperty list uchar int told\nelement vertex 4\n"
    head += "property float z\nproperty float x\nproperty float y\n"
    text = (
        head
        + "element tristrips 1\nproperty list int int vertex_indices\nend_header\n2 7 7\n9 0 0\n9 1 0\n9 0 1\n9 1 1\n8 0 1 2 3 -1 1 2 3\n"
    )
    (piece,) = read_pieces(text.encode(), "a.ply")
    assert piece.vertices[1].tolist() == [1, 0, 9]
    assert piece.triangles.tolist() == [[0, 1, 2], [1, 3, 2], [1, 2, 3]]
    assert piece.history == ("triangle strips split into triangles",)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("double x", "double u", "vertex properties u, y, z; wanted x, y and z"),
        ("double y", "double x", "make no sense"),
        ("list uchar", "list float", "make no sense"),
        ("vertex_indices", "corners", "face properties corners; wanted a list vertex_indices"),
        ("element face 1", "element face -1", "make no sense"),
        ("property double z", "property triple z", "header line 'property triple z'"),
        ("end_header", "", "a header without end"),
        (
            "list uchar int vertex_indices\nend_header",
            "list uchar float vertex_indices\nend_header",
            "vertex_indices that are no whole numbers",
        ),
    ],
)
def test_ply_headers_that_make_no_sense(old, new, message):
    text = ply("", [[0, 1, 2]]).decode().replace(old, new, 1)
    if "whole numbers" in message:
        text = text.replace("3 0 1 2", "3 0 1 1.5")
    with pytest.raises(InputError, match=message):
        read_pieces(text.encode(), "a.ply")


def test_a_huge_promise_is_refused_at_once():
    content = ply("<", [[0, 1, 2]]).replace(b"element face 1", b"element face 999999999999")
    with pytest.raises(FormatError, match="wanted 999,999,999,999 rows"):
        read_pieces(content, "a.ply")
