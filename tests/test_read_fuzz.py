"""A sample of the fuzz of files: ``python tests/fuzz_files.py`` runs ten thousand of each format."""

import pytest
from fuzz_files import FORMATS, LastingReader, fuzz, seeds

from torsionfe.outline.files import meshes, read_outline_report

COUNT = {"dxf": 60, "wkt": 250, "geojson": 150, "csv": 250}


@pytest.mark.parametrize("kind", FORMATS)
def test_mutated_files_end_in_an_outline_or_a_typed_error(kind, tmp_path, monkeypatch):
    reader = LastingReader(0.5)
    monkeypatch.setattr(meshes, "_arrays", reader)
    try:
        for number, data in enumerate(seeds(kind, tmp_path)):
            path = tmp_path / f"{number}.{kind}"
            path.write_bytes(data)
            assert read_outline_report(path).outline.area > 0.0
        tally, slowest, bad = fuzz(kind, COUNT.get(kind, 25), 2, tmp_path)
    finally:
        reader.stop()
    assert bad == []
    assert tally["outline"] < sum(tally.values())
    assert slowest < 5.0
