"""Adjacency against plain walks in Python over sets and dictionaries, on surfaces no one would draw on purpose."""

from collections import Counter, defaultdict

import numpy as np
import pytest

from structviz.surfaces.condition import examine
from structviz.surfaces.geometry import areas_and_normals
from structviz.surfaces.topology import connected_rows, topology, weld


def strip(steps, twisted, turned=()):
    """A closed band of triangles; twisted, it has no winding."""
    angle = np.linspace(0, 2 * np.pi, steps, endpoint=False)
    half = angle / 2 if twisted else np.zeros(steps)
    rims = [
        np.stack([(3 + w * np.cos(half)) * np.cos(angle), (3 + w * np.cos(half)) * np.sin(angle), w * np.sin(half)], 1) for w in (-1, 1)
    ]
    rows = []
    for k in range(steps):
        a, b, c, d = k, k + steps, (k + 1) % steps, (k + 1) % steps + steps
        if twisted and k + 1 == steps:
            c, d = d, c
        rows += [[a, b, c], [b, d, c]]
    triangles = np.array(rows)
    triangles[list(turned)] = triangles[list(turned)][:, ::-1]
    return np.concatenate(rims) * 100, triangles


def random_soup(seed):
    """A crowd of triangles on few vertices: edges of many, pinches, repeats, debris and seams without a winding."""
    rng = np.random.default_rng(seed)
    vertices = rng.normal(size=(rng.integers(5, 30), 3)) * 1000
    vertices[rng.integers(len(vertices))] = vertices[0]  # one place twice
    triangles = rng.integers(0, len(vertices), (rng.integers(1, 40), 3))
    if seed % 3 == 0:  # chance alone never makes a seam
        band, more = strip(int(rng.integers(4, 12)), bool(seed % 2), turned=rng.integers(0, 8, 3))
        triangles = np.concatenate([more, triangles[: len(triangles) // 4] + len(band) // 2])
        vertices = np.concatenate([band, vertices])
    return vertices, triangles


def places_of(vertices, triangles):
    return [tuple(tuple(vertices[v].tolist()) for v in row) for row in triangles]


def sides_of(corners):
    return [(corners[0], corners[1]), (corners[1], corners[2]), (corners[2], corners[0])]


def walk(count, links):
    """Groups of linked numbers, as a set of frozen sets."""
    beside = defaultdict(set)
    for one, two in links:
        beside[one].add(two)
        beside[two].add(one)
    left, groups = set(range(count)), set()
    while left:
        todo, group = [left.pop()], set()
        while todo:
            here = todo.pop()
            group.add(here)
            todo += [there for there in beside[here] if there in left]
            left -= beside[here]
        groups.add(frozenset(group))
    return groups


class Plain:
    """The same facts found one triangle at a time."""

    def __init__(self, vertices, triangles):
        self.rows, self.again, seen = [], {}, {}
        for row, corners in enumerate(places_of(vertices, triangles)):
            if len(set(corners)) == 3 and frozenset(corners) in seen:
                self.again[row] = seen[frozenset(corners)]
            elif len(set(corners)) == 3:
                seen[frozenset(corners)] = row
                self.rows.append((row, corners))
        self.at_edge = defaultdict(list)
        for g, (_, corners) in enumerate(self.rows):
            for side in sides_of(corners):
                self.at_edge[frozenset(side)].append((g, side))
        self.parts = walk(len(self.rows), [(u[0][0], w[0]) for u in self.at_edge.values() for w in u[1:]])
        alone = [u for u in self.at_edge.values() if len(u) == 2]
        self.links = [(u[0][0], u[1][0], u[0][1] == u[1][1]) for u in alone]
        self.sheets = walk(len(self.rows), [(a, b) for a, b, _ in self.links])

    def windable(self, sheet):
        beside = defaultdict(list)
        for a, b, against in self.links:
            beside[a].append((b, against))
            beside[b].append((a, against))
        root = min(sheet)
        turned, todo = {root: False}, [root]
        while todo:
            here = todo.pop()
            for there, against in beside[here]:
                if there not in turned:
                    turned[there] = turned[here] ^ against
                    todo.append(there)
                elif turned[there] != turned[here] ^ against:
                    return None
        return turned

    def pinched(self):
        count = 0
        fans = defaultdict(list)
        for g, (_, corners) in enumerate(self.rows):
            for place in corners:
                fans[place].append(g)
        for place, members in fans.items():
            number = {g: k for k, g in enumerate(members)}
            links = []
            for edge, users in self.at_edge.items():
                if place in edge:
                    links += [(number[users[0][0]], number[other[0]]) for other in users[1:]]
            count += len(walk(len(members), links)) > 1
        return count


def both(seed):
    vertices, triangles = random_soup(seed)
    areas, _ = areas_and_normals(vertices[triangles])
    return vertices, triangles, areas, topology(vertices, triangles, areas), Plain(vertices, triangles)


SEEDS = range(60)


@pytest.mark.parametrize("seed", SEEDS)
def test_a_repeated_triangle_goes_with_the_one_it_repeats(seed):
    vertices, triangles, _, found, plain = both(seed)
    _, normals = areas_and_normals(vertices[triangles])
    normals[found.turned] *= -1
    for again, first in plain.again.items():
        assert found.part_of[again] == found.part_of[first]
        assert found.sheet_of[again] == found.sheet_of[first]
        assert np.allclose(normals[again], normals[first])


def test_some_soups_hold_every_oddity():
    odd = Counter()
    for seed in SEEDS:
        vertices, triangles, areas, found, plain = both(seed)
        condition = examine(vertices, triangles, areas, found)
        odd["repeats"] += bool(plain.again)
        odd["crowds"] += bool(len(condition.nonmanifold_edges))
        odd["pinches"] += bool(condition.pinched_vertices)
        odd["seams"] += condition.not_orientable
        odd["parts"] += found.parts > 1
        odd["debris"] += bool(condition.zero_area.size)
    assert len(odd) == 6, odd
    assert min(odd.values()) >= 2, odd


@pytest.mark.parametrize("seed", SEEDS)
def test_parts_and_sheets_are_those_of_a_walk(seed):
    _, _, areas, found, plain = both(seed)
    groups = defaultdict(set)
    for g, (row, _) in enumerate(plain.rows):
        groups[found.part_of[row]].add(g)
    assert {frozenset(group) for group in groups.values()} == plain.parts
    sheets = defaultdict(set)
    for g, (row, _) in enumerate(plain.rows):
        sheets[found.sheet_of[row]].add(g)
    assert {frozenset(group) for group in sheets.values()} == plain.sheets
    size = np.bincount(found.part_of, areas)
    assert (np.diff(size) <= 1e-9 * size[0]).all()  # largest first


@pytest.mark.parametrize("seed", SEEDS)
def test_winding_is_that_of_a_walk_or_its_reverse(seed):
    _, _, _, found, plain = both(seed)
    crooked = set()
    for sheet in plain.sheets:
        slow = plain.windable(sheet)
        members = sorted(sheet)
        rows = [plain.rows[g][0] for g in members]
        if slow is None:
            crooked.add(int(found.part_of[rows[0]]))
            continue
        fast, slow = found.turned[rows], np.array([slow[g] for g in members])
        assert np.array_equal(fast, slow) or np.array_equal(fast, ~slow)
        assert 2 * fast.sum() <= len(fast)  # the minority is turned
    assert set(found.unorientable.tolist()) == crooked


@pytest.mark.parametrize("seed", SEEDS)
def test_condition_is_that_of_a_count(seed):
    vertices, triangles, areas, found, plain = both(seed)
    condition = examine(vertices, triangles, areas, found)
    uses = Counter({edge: len(users) for edge, users in plain.at_edge.items()})
    many = {edge for edge, count in uses.items() if count > 2}
    assert {frozenset(tuple(vertices[v].tolist()) for v in edge) for edge in condition.nonmanifold_edges} == many
    assert len(condition.nonmanifold_edges) == len(many)
    assert condition.repeated.tolist() == list(plain.again)
    rim = [edge for edge, count in uses.items() if count == 1]
    number = {place: k for k, place in enumerate({place for edge in rim for place in edge})}
    assert condition.rims == len(walk(len(number), [tuple(number[place] for place in edge) for edge in rim]))
    assert condition.pinched_vertices == plain.pinched() == len(condition.pinched)
    assert condition.duplicate_vertices == len(vertices) - len({tuple(v) for v in vertices.tolist()})


@pytest.mark.parametrize("seed", range(10))
def test_welding_numbers_places(seed):
    rng = np.random.default_rng(seed)
    vertices = rng.integers(0, 3, (50, 3)).astype(float)
    number, places = weld(vertices)
    slow = {tuple(v) for v in vertices.tolist()}
    assert places == len(slow)
    assert len({(n, tuple(v)) for n, v in zip(number.tolist(), vertices.tolist(), strict=True)}) == places


def test_places_that_share_a_key_are_not_welded():
    # Two places whose mixed keys round to the same number: the second differs by less than the key can tell.
    vertices = np.array([[1e9, 0.0, 0.0], [1e9, 0.0, 1e-9], [1e9, 0.0, 0.0]])
    number, places = weld(vertices)
    assert places == 2
    assert number[0] == number[2] != number[1]


def test_groups_are_numbered_by_their_first_row():
    group, groups = connected_rows(np.array([[2, 0], [1, 1], [0, 2], [3, 3]]))
    assert groups == 3
    assert group.tolist() == [0, 1, 0, 2]


@pytest.mark.parametrize("twisted", [False, True])
def test_a_seam_is_all_that_a_winding_by_tree_leaves(twisted):
    vertices, triangles = strip(40, twisted, turned=(3, 4, 30, 31, 32))
    areas, _ = areas_and_normals(vertices[triangles])
    found = topology(vertices, triangles, areas)
    assert found.unorientable.tolist() == ([0] if twisted else [])
    alone = found.uses == 2
    one, two = np.arange(len(found.partner)) // 3, found.partner // 3
    left = alone & (found.against ^ found.turned[one] ^ found.turned[two])
    # A tree leaves every edge that is not its own to chance; on a band that is one edge, met from both of its sides.
    assert left.sum() == (2 if twisted else 0)


def test_a_seam_in_one_part_leaves_the_winding_of_the_others():
    band, rows = strip(40, True)
    flat, more = strip(40, False, turned=(5, 6, 7))
    vertices = np.concatenate([band, flat + [5000.0, 0, 0]])
    triangles = np.concatenate([rows, more + len(band)])
    areas, _ = areas_and_normals(vertices[triangles])
    found = topology(vertices, triangles, areas)
    assert len(found.unorientable) == 1
    assert np.flatnonzero(found.turned[80:]).tolist() == [5, 6, 7]
