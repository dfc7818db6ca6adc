"""What is written comes back the same: outlines at random, in every format; and how files are written."""

import os

import numpy as np
import pytest
from drawn import angle, assert_same, circle, outlines, rectangle
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from torsionfe.errors import InputError, UnitError
from torsionfe.outline.files import read_outline, read_outline_report, write_outline
from torsionfe.outline.outline import Outline
from torsionfe.storing import store
from torsionfe.units import UNITS

PART = Outline(angle().filleted(8.0).vertices, angle().filleted(8.0).bulges, [circle(4, 4, 2), rectangle(3, 3, 60, 2)])
SLOW = settings(max_examples=12, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
QUICK = settings(SLOW, max_examples=30)


@pytest.mark.parametrize("ending", ["csv", "geojson", "json", "dxf"])
def test_numbers_come_back_to_the_last_bit(tmp_path, ending):
    path = write_outline(PART, tmp_path / f"part.{ending}", unit="mm")
    result = read_outline_report(path)
    assert result.outline == PART
    assert result.unit == "mm"
    layers = ("read from the layers 'outer' (1), 'voids' (2)",)
    assert result.notes == (layers if ending == "dxf" else ())
    assert result.warnings == ()


@SLOW
@given(outline=outlines())
def test_any_outline_as_dxf(tmp_path, outline):
    assert read_outline(write_outline(outline, tmp_path / "a.dxf"), restore_arcs=False) == outline


@QUICK
@given(outline=outlines(), unit=st.sampled_from([None, *UNITS]))
def test_any_outline_as_csv(tmp_path, outline, unit):
    result = read_outline_report(write_outline(outline, tmp_path / "a.csv", unit=unit), restore_arcs=False)
    assert (result.outline, result.unit) == (outline, unit)


@QUICK
@given(outline=outlines(), unit=st.sampled_from([None, *UNITS]))
def test_any_outline_as_geojson(tmp_path, outline, unit):
    result = read_outline_report(write_outline(outline, tmp_path / "a.geojson", unit=unit), restore_arcs=False)
    assert result.warnings == ()
    assert (result.outline, result.unit) == (outline, unit)


@QUICK
@given(outline=outlines())
def test_any_outline_as_well_known_text(tmp_path, outline):
    path = write_outline(outline, tmp_path / "a.wkt")
    # an arc is written by the point halfway: its bulge comes back as exactly as that point is rounded
    assert_same(outline, read_outline(path, restore_arcs=False), rel=1e-14)
    assert path.read_text().startswith("CURVEPOLYGON" if outline.edges.bulge.any() else "POLYGON")


@QUICK
@given(outline=outlines())
def test_restoring_leaves_what_was_arcs_alone(tmp_path, outline):
    result = read_outline_report(write_outline(outline, tmp_path / "a.csv"))
    assert result.outline == outline
    assert result.arcs_restored == 0


@pytest.mark.parametrize("ending", ["csv", "geojson", "dxf"])
@pytest.mark.parametrize("unit", UNITS)
def test_every_unit_is_stated_and_read(tmp_path, ending, unit):
    result = read_outline_report(write_outline(PART, tmp_path / f"a.{ending}", unit=unit))
    assert result.unit == unit


def test_well_known_text_has_no_unit_to_state(tmp_path):
    path = write_outline(PART, tmp_path / "a.wkt", unit="mm")
    assert read_outline_report(path).unit is None
    with pytest.raises(UnitError, match="pass file_unit="):
        read_outline(path, unit="in")
    assert read_outline(path, unit="in", file_unit="mm").size == pytest.approx(80 / 25.4)


def test_a_file_is_replaced_whole_or_not_at_all(tmp_path, monkeypatch):
    path = write_outline(PART, tmp_path / "a.csv")
    before = path.read_bytes()

    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(InputError, match="cannot be written: No space left"):
        write_outline(rectangle(1, 1), path)
    assert path.read_bytes() == before
    assert os.listdir(tmp_path) == ["a.csv"]  # nothing half-written stays behind
    monkeypatch.undo()
    write_outline(rectangle(1, 1), path)
    assert read_outline(path) == rectangle(1, 1)


def test_stored_files_are_readable_as_others_are(tmp_path):
    mask = os.umask(0o027)
    try:
        path = store(tmp_path / "a.txt", b"text")
    finally:
        os.umask(mask)
    assert path.stat().st_mode & 0o777 == 0o640
    with pytest.raises(InputError, match="cannot be written"):
        store(tmp_path / "nowhere" / "a.txt", b"")
    with pytest.raises(InputError, match="cannot be written"):
        store(tmp_path / ("a" * 300), b"")


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"outline": "x", "path": "a.csv"}, "an Outline is needed, got str"),
        ({"outline": PART, "path": "a.step"}, "the ending '.step' tells no format that can be written"),
        ({"outline": PART, "path": 3}, "3 is no path"),
        ({"outline": PART, "path": "a.csv", "format": "cvs"}, "did you mean 'csv'"),
        ({"outline": PART, "path": "a.csv", "unit": "furlong"}, "no unit of length"),
    ],
)
def test_bad_arguments(arguments, message):
    with pytest.raises(InputError, match=message):
        write_outline(**arguments)


def test_the_format_by_name(tmp_path):
    path = write_outline(PART, tmp_path / "a.out", format="csv")
    assert read_outline(path, format="csv") == PART
    assert np.array_equal(read_outline(path, format="csv").bulges, PART.bulges)
