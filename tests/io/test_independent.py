"""Earthquake mechanisms and azimuths from wells: tables, QuakeML, the keys that name them, and what is refused."""

from __future__ import annotations

import builtins
import csv
import importlib
import io
import warnings

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from structviz.errors import FormatError, InputError, TableError
from structviz.io import read_model
from structviz.io.independent import with_measurements
from structviz.io.mechanisms import read_mechanisms
from structviz.io.shmax import read_azimuths
from structviz.io.units import Frame
from structviz.stress.mechanisms import auxiliary_plane_deg, moment_tensor, pbt_axes
from structviz.stress.tensor import frame_angle_deg

HEAD = "strike_deg,dip_deg,rake_deg,strike2_deg,dip2_deg,rake2_deg,name,easting,northing,up,weight\n"


def mechanisms(rows, frame=Frame(), head=HEAD):  # noqa: B008
    return read_mechanisms((head + rows).encode(), "quakes.csv", frame)


def azimuths(rows, frame=Frame(), head="shmax_deg,uncertainty_deg,name,easting,northing\n"):  # noqa: B008
    return read_azimuths((head + rows).encode(), "wells.csv", frame)


class TestTableOfMechanisms:
    def test_every_column_arrives(self):
        (one,), told = mechanisms("0,60,-90,180,30,-90,Q1,1,2,-3,0.5\n")
        assert (one.name, one.place, one.weight) == ("Q1", (1.0, 2.0, -3.0), 0.5)
        assert one.planes == ((0.0, 60.0, -90.0), (180.0, 30.0, -90.0))
        assert told == ()

    def test_three_angles_are_enough(self):
        (one,), told = mechanisms("10,60,-90\n", head="strike_deg,dip_deg,rake_deg\n")
        assert (one.name, one.planes, one.weight, told) == ("row 2", ((10.0, 60.0, -90.0),), 1.0, ())
        assert np.isnan(one.place).all()

    @given(st.floats(-360, 360), st.floats(0, 90), st.floats(-180, 360))
    def test_angles_are_wrapped_and_stay_the_same_mechanism(self, strike, dip, rake):
        (one,), _ = mechanisms(f"{strike!r},{dip!r},{rake!r},,,,,,,,\n")
        ((s, d, r),) = one.planes
        assert 0 <= s <= 360
        assert d == dip
        assert -180 <= r <= 180
        assert abs((s - strike + 180) % 360 - 180) < 1e-9
        assert abs((r - rake + 180) % 360 - 180) < 1e-9

    def test_places_are_in_the_unit_of_the_model_and_depth_is_down(self):
        (one,), _ = mechanisms("0,60,0,1,2,3\n", Frame("km", "depth"), "strike_deg,dip_deg,rake_deg,easting,northing,depth\n")
        assert one.place == (1000.0, 2000.0, -3000.0)
        (one,), _ = mechanisms("0,60,0,1,2\n", head="strike_deg,dip_deg,rake_deg,easting,northing\n")
        assert one.place[:2] == (1.0, 2.0)
        assert np.isnan(one.place[2])

    def test_planes_of_two_earthquakes_are_told(self):
        _, told = mechanisms("0,60,-90,180,30,-90,,,,,\n0,60,-90,180,30,-50,,,,,\n")
        (only,) = told
        assert only.startswith("quakes.csv, row 3: its planes make mechanisms ")
        assert only.endswith(" degrees apart, so they are not one earthquake's")

    @pytest.mark.parametrize(
        ("row", "message"),
        [
            (",60,0,,,,,,,,", r"quakes\.csv, row 2: found no strike_deg; wanted a number"),
            ("N30,60,0,,,,,,,,", "found strike_deg 'N30'; wanted a number"),
            ("0,95,0,,,,,,,,", "found dip_deg 95; wanted 0 to 90"),
            ("0,60,400,,,,,,,,", "found rake_deg 400; wanted -180 to 360"),
            ("0,60,nan,,,,,,,,", "found rake_deg nan; wanted -180 to 360"),
            ("0,60,0,90,,,,,,,", "found no dip2_deg; wanted a number"),
            ("0,60,0,,,,,5,,,", "found no northing; wanted a number"),
            ("0,60,0,,,,,,,,-1", "found weight -1; wanted 0 or more"),
        ],
    )
    def test_bad_rows_are_named(self, row, message):
        with pytest.raises(TableError, match=message):
            mechanisms(row + "\n")

    def test_a_missing_column_and_an_empty_table_are_told(self):
        with pytest.raises(TableError, match=r"wanted a column 'rake_deg'\n  next: rename the column 'rake' to 'rake_deg'"):
            mechanisms("0,60,0\n", head="strike_deg,dip_deg,rake\n")
        with pytest.raises(TableError, match=r"an empty table.*\n  next: write a header, and a row below it for each entry"):
            mechanisms("", head="")
        with pytest.raises(TableError, match="found both up and depth"):
            mechanisms("0,60,0,1,2,3,4\n", head="strike_deg,dip_deg,rake_deg,easting,northing,up,depth\n")

    def test_columns_that_are_not_used_are_told(self):
        _, told = mechanisms("0,60,0,5.1\n", head="strike_deg,dip_deg,rake_deg,magnitude\n")
        assert told == ("quakes.csv: columns magnitude are not used",)


class TestTableOfWells:
    def test_an_azimuth_is_a_line(self):
        found, told = azimuths("200,10,W1,1,2\n-10,5,,,\n")
        assert [(well.name, well.shmax_deg, well.uncertainty_deg) for well in found] == [("W1", 20.0, 10.0), ("row 3", 170.0, 5.0)]
        assert found[0].place[:2] == (1.0, 2.0)
        assert np.isnan(found[1].place).all()
        assert told == ()

    @pytest.mark.parametrize(
        ("row", "message"),
        [
            ("NNE,10,,,", r"wells\.csv, row 2: found shmax_deg 'NNE'; wanted a number"),
            ("400,10,,,", "found shmax_deg 400; wanted -360 to 360"),
            ("20,,,,", "found no uncertainty_deg; wanted a number\n  next: fill in uncertainty_deg, or delete the row"),
            ("20,-1,,,", "found uncertainty_deg -1; wanted 0 to 90"),
            ("20,10,W,,3", "found no easting"),
        ],
    )
    def test_bad_rows_are_named(self, row, message):
        with pytest.raises(TableError, match=message):
            azimuths(row + "\n")

    def test_a_column_under_two_names_is_refused(self):
        with pytest.raises(TableError, match="two columns 'shmax_deg'"):
            azimuths("1,2,3\n", head="shmax_deg,uncertainty_deg,SHmax azimuth (degEofN)\n")


def quakeml(planes=True, tensor=True, strike=30.0):
    """Return a catalogue of one event with a mechanism and one without, written by ObsPy."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        event = importlib.import_module("obspy.core.event")
        nodal = event.NodalPlanes(nodal_plane_1=event.NodalPlane(strike=strike, dip=60.0, rake=350.0), nodal_plane_2=None)
        m = moment_tensor(30.0, 60.0, -10.0) * 3e17
        parts = event.Tensor(m_rr=m[2, 2], m_tt=m[1, 1], m_pp=m[0, 0], m_rt=-m[1, 2], m_rp=m[0, 2], m_tp=-m[0, 1])
        moment = event.MomentTensor(tensor=parts, derived_origin_id=event.ResourceIdentifier("smi:local/origin/1"))
        mechanism = event.FocalMechanism(nodal_planes=nodal if planes else None, moment_tensor=moment if tensor else None)
        name = event.ResourceIdentifier("smi:local/event?eventid=us7000abcd")
        catalogue = event.Catalog([event.Event(resource_id=name, focal_mechanisms=[mechanism]), event.Event()])
        content = io.BytesIO()
        catalogue.write(content, format="QUAKEML")
    return content.getvalue()


class TestQuakeml:
    def test_nodal_planes_arrive_and_events_without_are_told(self):
        (one,), told = read_mechanisms(quakeml(), "quakes.xml", Frame())
        assert (one.name, one.planes) == ("us7000abcd", ((30.0, 60.0, -10.0),))
        assert np.isnan(one.place).all()
        assert told == ("quakes.xml: 1 of 2 events have no mechanism",)

    def test_a_moment_tensor_gives_both_planes(self):
        (one,), _ = read_mechanisms(quakeml(planes=False), "quakes.quakeml", Frame())
        given = [(30.0, 60.0, -10.0), tuple(float(angle) for angle in auxiliary_plane_deg(30.0, 60.0, -10.0))]
        off = [min(np.abs((np.subtract(plane, other) + 180) % 360 - 180).max() for other in given) for plane in one.planes]
        assert len(one.planes) == 2
        assert max(off) < 1e-6
        assert frame_angle_deg(pbt_axes(*one.planes[0]), pbt_axes(30.0, 60.0, -10.0)) < 1e-5

    def test_what_cannot_be_used_is_refused(self):
        with pytest.raises(FormatError, match=r"quakes\.xml: found 2 events without a mechanism; wanted nodal planes or moment tensors"):
            read_mechanisms(quakeml(planes=False, tensor=False), "quakes.xml", Frame())
        with pytest.raises(FormatError, match=r"quakes\.xml, event us7000abcd: found a nodal plane with strike 930, dip 60, rake 350"):
            read_mechanisms(quakeml(strike=930.0), "quakes.xml", Frame())
        for content in (b"", b"strike,dip\n", b"<quakeml", quakeml()[:400], b"<?xml version='1.0'?><a/>"):
            with pytest.raises(FormatError, match=r"quakes\.xml: found "):
                read_mechanisms(content, "quakes.xml", Frame())

    def test_entities_are_not_followed(self, tmp_path):
        (tmp_path / "secret").write_text("secret")
        head = f'<?xml version="1.0"?><!DOCTYPE q [<!ENTITY e SYSTEM "{(tmp_path / "secret").as_uri()}">]>'.encode()
        with pytest.raises(FormatError, match="found a document type declaration; wanted QuakeML, which has none"):
            read_mechanisms(quakeml().replace(b"<?xml version='1.0' encoding='utf-8'?>", head), "quakes.xml", Frame())

    def test_the_extra_is_named_where_it_is_missing(self, monkeypatch):
        content = quakeml()
        real = builtins.__import__

        def without(name, *more):
            if name.split(".")[0] == "obspy":
                raise ImportError(name)
            return real(name, *more)

        monkeypatch.setattr(builtins, "__import__", without)
        with pytest.raises(FormatError, match=r"found QuakeML, which needs ObsPy.*\n  next: install structviz with the extra 'quakes'"):
            read_mechanisms(content, "quakes.xml", Frame())


@pytest.fixture
def folder(tmp_path):
    """Return a folder with one surface, a table of mechanisms and one of wells."""
    (tmp_path / "a.off").write_text("OFF\n3 1 0\n0 0 -10\n100 0 -10\n0 0 -60\n3 0 1 2\n")
    (tmp_path / "faults.csv").write_text("name,surface,sense\nA,a.off,normal\n")
    (tmp_path / "quakes.csv").write_text("strike_deg,dip_deg,rake_deg,author\n0,60,-90,me\n")
    (tmp_path / "wells.csv").write_text("shmax_deg,uncertainty_deg,easting,northing\n20,10,1,2\n")
    return tmp_path


def model(folder, *lines):
    (folder / "model.toml").write_text("\n".join(lines) + "\n", encoding="utf-8")
    return read_model(folder / "model.toml")


class TestModel:
    def test_the_model_file_names_them(self, folder):
        found = model(folder, 'length_unit = "km"', 'faults = "faults.csv"', 'mechanisms = "quakes.csv"', 'well_azimuths = "wells.csv"')
        assert (len(found.mechanisms), found.mechanisms_are, len(found.azimuths)) == (1, "independent", 1)
        assert found.azimuths[0].place[:2] == (1000.0, 2000.0)
        assert {"quakes.csv", "wells.csv"} <= {each.path for each in found.inputs}
        assert "quakes.csv: columns author are not used" in [finding.message for finding in found.findings]

    def test_mechanisms_can_be_evidence(self, folder):
        found = model(folder, 'faults = "faults.csv"', 'mechanisms = "quakes.csv"', 'mechanisms_are = "evidence"')
        assert found.mechanisms_are == "evidence"
        assert model(folder, 'faults = "faults.csv"').mechanisms == ()

    @pytest.mark.parametrize(
        ("lines", "error", "message"),
        [
            (('mechanisms = "none.csv"',), InputError, r"none\.csv: found no such file"),
            (('mechanisms = "../quakes.csv"',), InputError, "which leaves the folder of the model"),
            (("mechanisms = 3",), TableError, "found mechanisms = 3; wanted text in quotes"),
            (('mechanisms = "quakes.csv"', 'mechanisms_are = "evidense"'), TableError, "next: did you mean 'evidence'"),
            (('mechanisms_are = "evidence"',), TableError, "found mechanisms_are without mechanisms"),
            (('wells = "wells.csv"',), TableError, r"found key 'wells'; wanted one of .*well_azimuths.*\n  next: did you mean"),
            (('well_azimuths = "quakes.csv"',), TableError, r"quakes\.csv: found columns strike_deg.*wanted a column 'shmax_deg'"),
        ],
    )
    def test_mistakes_in_the_model_file_are_named(self, folder, lines, error, message):
        with pytest.raises(error, match=message):
            model(folder, 'faults = "faults.csv"', *lines)

    def test_a_folder_of_meshes_can_have_them_too(self, folder, tmp_path_factory):
        elsewhere = tmp_path_factory.mktemp("elsewhere")
        (folder / "quakes.csv").rename(elsewhere / "quakes.csv")
        bare = read_model(folder / "a.off")
        found = with_measurements(bare, elsewhere / "quakes.csv", folder / "wells.csv")
        assert (len(found.mechanisms), len(found.azimuths), found.faults) == (1, 1, bare.faults)
        assert [each.path for each in found.inputs] == ["a.off", "quakes.csv", "wells.csv"]
        assert with_measurements(bare) is bare
        with pytest.raises(InputError, match=r"nothing\.csv: found no such file"):
            with_measurements(bare, folder / "nothing.csv")


def test_the_open_catalogues_are_read_as_they_are(shared_data):
    """P and T of every event within a degree of those printed, from the planes as structviz holds them."""
    for table, count in (("himalaya_tibet.csv", 168), ("makran_se_iran.csv", 273)):
        path = shared_data / "focal_mechanisms" / table
        found, told = read_mechanisms(path.read_bytes(), table, Frame())
        assert len(found) == count
        assert len(told) == 1  # the columns not used; no event whose planes disagree
        with path.open(encoding="utf-8") as file:
            rows = list(csv.DictReader(file))
        for plane in (0, 1):
            axes = pbt_axes(*np.array([each.planes[plane] for each in found]).T)
            for row, key in ((0, "P"), (2, "T")):
                trend, plunge = (np.radians([float(r[key + part]) for r in rows]) for part in ("az", "pl"))
                printed = np.stack([np.cos(plunge) * np.sin(trend), np.cos(plunge) * np.cos(trend), -np.sin(plunge)], -1)
                assert np.degrees(np.arccos(np.clip(np.abs((axes[:, row] * printed).sum(-1)), 0, 1))).max() < 1.0


def test_the_open_table_of_boreholes_is_read_as_it_is(shared_data):
    path = shared_data / "shmax_boreholes" / "LuttrellHardebeckJGR2021_Table1.csv"
    found, (told,) = read_azimuths(path.read_bytes(), path.name, Frame())
    assert len(found) == 57
    assert (found[18].name, found[18].shmax_deg, found[18].uncertainty_deg) == ("19", 128.0, 12.0)
    assert "Geologic Context, Latitude, Longitude" in told
