"""The journal of a sweep: checksums, half lines, changes, locks, and what kill -9 leaves."""

import json
import math
import os
import random
import subprocess
import sys
import threading
import zlib

import numpy as np
import pytest
from crash_sweep import campaign

from torsionfe.errors import InputError, JournalError
from torsionfe.outline.shapes import rectangle
from torsionfe.study import journal as journals
from torsionfe.study.journal import Journal, Session, read_journal
from torsionfe.study.sweep import sweep
from torsionfe.study.work import LOST

SESSION = Session("1.0", {"rel_tol": 1e-3, "peak_tol": math.inf}, ("width",))
WIDTHS = [10.0, 15.0, 20.0, 25.0]


def key(k):
    return bytes([k]) * 16


def row(k, **more):
    return {"torsion_constant": 1.0 / 3.0 + k, "hot_spot_x": math.nan, "status": "ok", "error": ""} | more


def filled(path, count=3):
    with Journal(path, SESSION) as book:
        for k in range(count):
            book.append(key(k), k, {"width": 0.1 * k}, row(k))
    return path


def swept(path, widths=WIDTHS, **options):
    return sweep({"width": widths, "height": 5.0}, rectangle, workers=0, journal=path, **options)


@pytest.fixture
def solves(monkeypatch):
    """Count the sections that are really solved."""
    from torsionfe.study import dispatch

    seen = []

    def counted(parcel, settings):
        seen.append(parcel)
        return real(parcel, settings)

    real = dispatch.solve_parcel
    monkeypatch.setattr(dispatch, "solve_parcel", counted)
    return seen


# --- rows -------------------------------------------------------------------------------------------------


def test_rows_come_back_to_the_last_bit(tmp_path):
    path = filled(tmp_path / "j")
    with Journal(path, SESSION) as book:
        for k in range(3):
            found = book.find(key(k))
            assert found["torsion_constant"] == 1.0 / 3.0 + k
            assert math.isnan(found["hot_spot_x"])
        assert book.find(key(9)) is None
        assert book.notes == []


def test_infinite_and_missing_numbers_are_plain_json(tmp_path):
    with Journal(tmp_path / "j", SESSION) as book:
        book.append(key(0), 0, {"width": np.float64(2.0)}, row(0, stress_rel_error=math.inf))
    for line in (tmp_path / "j").read_text().splitlines()[1:]:
        json.loads(line.split(" ", 2)[2], parse_constant=lambda name: pytest.fail(f"{name} is no JSON"))
    assert read_journal(tmp_path / "j")["stress_rel_error"][0] == math.inf


def test_each_line_carries_the_checksum_of_its_rest(tmp_path):
    lines = filled(tmp_path / "j").read_bytes().splitlines()
    assert lines[0] == b"torsionfe sweep journal, format 1"
    for line in lines[1:]:
        assert int(line[:8], 16) == zlib.crc32(line[9:])


def test_of_two_rows_of_a_section_the_later_counts(tmp_path):
    path = filled(tmp_path / "j")
    with Journal(path, SESSION) as book:
        book.append(key(1), 1, {"width": 0.1}, row(7))
    with Journal(path, SESSION) as book:
        assert book.find(key(1))["torsion_constant"] == 1.0 / 3.0 + 7


def test_a_section_whose_worker_died_is_tried_again(tmp_path):
    with Journal(tmp_path / "j", SESSION) as book:
        book.append(key(0), 0, {"width": 1.0}, {"status": LOST, "error": "killed"})
    with Journal(tmp_path / "j", SESSION) as book:
        assert book.find(key(0)) is None


def test_a_digest_that_agrees_in_its_first_half_only_is_another_section(tmp_path):
    path = filled(tmp_path / "j")
    with Journal(path, SESSION) as book:
        assert book.find(key(1)[:8] + bytes(8)) is None


# --- damage -----------------------------------------------------------------------------------------------


def test_a_half_written_last_line_is_dropped_wherever_it_was_cut(tmp_path):
    path = filled(tmp_path / "j", 2)
    whole = path.read_bytes()
    ends = [k + 1 for k, byte in enumerate(whole) if byte == ord("\n")]
    for cut in {*range(0, len(whole), 4), *(near + end for end in ends[:-1] for near in (-1, 0, 1))}:
        path.write_bytes(whole[:cut])
        with Journal(path, SESSION) as book:
            kept = sum(end <= cut for end in ends)
            assert [book.find(key(k)) is not None for k in range(2)] == [kept > 2, kept > 3], cut
            assert bool(book.notes) == (cut not in (0, *ends) and cut > ends[0]), cut
            book.append(key(9), 9, {"width": 1.0}, row(9))
        assert read_journal(path)["torsion_constant"][-1] == 1.0 / 3.0 + 9


def test_zeros_that_a_power_cut_left_at_the_end_are_dropped(tmp_path):
    path = filled(tmp_path / "j")
    with open(path, "ab") as file:
        file.write(bytes(4096))
    with Journal(path, SESSION) as book:
        assert "4096 bytes" in book.notes[0]
        assert book.find(key(2)) is not None


def test_a_damaged_line_is_named_and_only_its_section_solved_again(tmp_path, solves):
    path = tmp_path / "j"
    reference = swept(path)
    lines = path.read_bytes().splitlines(keepends=True)
    damaged = bytearray(lines[3])
    damaged[60] ^= 1
    path.write_bytes(b"".join([*lines[:3], bytes(damaged), *lines[4:]]))
    solves.clear()
    table = swept(path)
    assert table.same_as(reference)
    assert len(solves) == 1
    assert any("damaged" in note and "line 4" in note for note in table.notes)


def test_every_flipped_bit_is_seen(tmp_path):
    line = filled(tmp_path / "j", 1).read_bytes().splitlines(keepends=True)[-1]
    assert journals._parsed(line) is not None
    for place in range(len(line)):
        for bit in range(8):
            flipped = bytearray(line)
            flipped[place] ^= 1 << bit
            assert journals._parsed(bytes(flipped)) is None


def test_a_damaged_session_line_is_not_trusted(tmp_path):
    path = filled(tmp_path / "j")
    lines = path.read_bytes().splitlines(keepends=True)
    path.write_bytes(b"".join([lines[0], lines[1][:-3] + b"\n", *lines[2:]]))
    with pytest.raises(JournalError, match="how its rows were solved is damaged"):
        Journal(path, SESSION)
    with Journal(path, SESSION, "keep") as book:
        assert book.find(key(1)) is not None
        assert any("settings not known" in note for note in book.summary())


# --- resuming ---------------------------------------------------------------------------------------------


def test_a_finished_sweep_is_read_not_solved(tmp_path, solves):
    first = swept(tmp_path / "j")
    size = (tmp_path / "j").stat().st_size
    solves.clear()
    again = swept(tmp_path / "j")
    assert solves == []
    assert again.same_as(first)
    assert again["seconds"].tolist() == first["seconds"].tolist()
    assert (tmp_path / "j").stat().st_size == size
    assert again.notes == ()


def test_a_larger_grid_solves_what_is_new_whatever_the_order(tmp_path, solves):
    swept(tmp_path / "j")
    solves.clear()
    table = swept(tmp_path / "j", [30.0, *reversed(WIDTHS)])
    assert len(solves) == 1
    assert table.same_as(swept(None, [30.0, *reversed(WIDTHS)]))
    assert table.notes == ()


def test_changed_inputs_are_said(tmp_path):
    swept(tmp_path / "j")
    table = swept(tmp_path / "j", [10.0, 15.0, 99.0])
    assert table["width"].tolist() == [10.0, 15.0, 99.0]
    assert "inputs have changed: 2 of the 4 rows" in table.notes[0]


def test_a_changed_build_function_is_solved_anew(tmp_path, solves):
    grid = {"width": [10.0, 20.0]}
    sweep(grid, lambda width: rectangle(width, 5.0), workers=0, journal=tmp_path / "j")
    solves.clear()
    table = sweep(grid, lambda width: rectangle(width, 6.0), workers=0, journal=tmp_path / "j")
    assert len(solves) == 2
    assert table["area"].tolist() == [60.0, 120.0]


def test_failed_sections_are_kept_once(tmp_path):
    first = swept(tmp_path / "j", [10.0, -1.0])
    size = (tmp_path / "j").stat().st_size
    again = swept(tmp_path / "j", [10.0, -1.0])
    assert again.same_as(first)
    assert again["status"].tolist() == ["ok", "failed"]
    assert (tmp_path / "j").stat().st_size == size
    assert read_journal(tmp_path / "j").same_as(first)


# --- another version, other settings ----------------------------------------------------------------------


@pytest.mark.parametrize(
    ("other", "said"),
    [
        (Session("1.1", SESSION.settings, SESSION.parameters), "program version 1.0, now 1.1"),
        (Session("1.0", {"rel_tol": 1e-4, "peak_tol": math.inf}, SESSION.parameters), "rel_tol 0.001, now 0.0001"),
        (Session("1.0", SESSION.settings, ("depth",)), "parameters width, now depth"),
    ],
)
def test_changes_are_refused_kept_or_put_aside(tmp_path, other, said):
    path = filled(tmp_path / "j")
    whole = path.read_bytes()
    with pytest.raises(JournalError, match=said):
        Journal(path, other)
    assert path.read_bytes() == whole
    with Journal(path, other, "keep") as book:
        assert book.find(key(0)) is not None
        assert any(said in note and "1 rows were kept" in note for note in book.summary())
    with Journal(path, SESSION, "restart") as book:
        assert book.find(key(0)) is None
        assert "j.1" in book.notes[0]
    assert (tmp_path / "j.1").read_bytes().startswith(whole)


def test_settings_are_part_of_a_sweeps_session(tmp_path):
    swept(tmp_path / "j")
    with pytest.raises(JournalError, match=r"rel_tol 0\.001, now 0\.0001.*on_change='keep'"):
        swept(tmp_path / "j", rel_tol=1e-4)
    kept = swept(tmp_path / "j", [*WIDTHS, 30.0], rel_tol=1e-4, on_change="keep")
    assert "4 rows were kept" in kept.notes[0]
    fresh = swept(tmp_path / "j", rel_tol=1e-5, on_change="restart")
    assert (fresh["torsion_constant_upper"] / fresh["torsion_constant_lower"] - 1.0).max() < 1.1e-5


def test_on_change_is_one_of_three(tmp_path):
    with pytest.raises(InputError, match="on_change"):
        Journal(tmp_path / "j", SESSION, "ignore")
    assert not (tmp_path / "j").exists()


# --- files and locks --------------------------------------------------------------------------------------


def test_another_file_is_left_as_it_is(tmp_path):
    path = tmp_path / "data.csv"
    for content in (b"x", b"depth,width\n1,2\n", b"torsionfe sweep journal, format 7\n"):
        path.write_bytes(content)
        for use in (lambda: Journal(path, SESSION, "restart"), lambda: read_journal(path)):
            with pytest.raises(JournalError, match=r"no sweep journal|does not know"):
                use()
        assert path.read_bytes() == content


def test_places_where_no_journal_can_be(tmp_path):
    with pytest.raises(JournalError, match="no folder"):
        Journal(tmp_path / "none" / "j", SESSION)
    with pytest.raises(JournalError, match="is no file"):
        Journal(tmp_path, SESSION)
    with pytest.raises(JournalError, match="path"):
        Journal(3.5, SESSION)
    with pytest.raises(JournalError, match="can't be read"):
        read_journal(tmp_path / "none")


def test_a_second_run_is_refused_until_the_first_has_ended(tmp_path):
    path = tmp_path / "j"
    with Journal(path, SESSION) as book:
        with pytest.raises(JournalError, match="in use by another run"):
            Journal(path, SESSION)
        failed = []
        thread = threading.Thread(target=lambda: failed.append(attempt(path)))
        thread.start()
        thread.join()
        assert "in use" in failed[0]
        assert "in use" in attempt_elsewhere(path)
        book.append(key(0), 0, {"width": 1.0}, row(0))
        assert len(read_journal(path)) == 1  # reading is allowed
    assert attempt(path) == "free"
    assert attempt_elsewhere(path) == "free"


def attempt(path):
    try:
        Journal(path, SESSION).close()
    except JournalError as error:
        return str(error)
    return "free"


def attempt_elsewhere(path):
    code = f"import sys; sys.path[:] = {sys.path!r}\nfrom test_journal import attempt; print(attempt({str(path)!r}))"
    return subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.strip()


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
def test_a_forked_child_does_not_hold_the_lock(tmp_path):
    book = Journal(tmp_path / "j", SESSION)
    (born, tell), (wait, go) = os.pipe(), os.pipe()
    child = os.fork()
    if child == 0:  # pragma: no cover (another process)
        os.close(go)
        os.write(tell, b"x")
        os.read(wait, 1)  # until the parent has tried
        os._exit(0)
    os.read(born, 1)
    book.close()
    try:
        assert attempt(tmp_path / "j") == "free"
    finally:
        for end in (born, tell, wait, go):
            os.close(end)
        os.waitpid(child, 0)


def test_a_full_disk_is_said_and_earlier_rows_stand(tmp_path, monkeypatch):
    path = filled(tmp_path / "j")
    real = os.write
    with Journal(path, SESSION) as book:

        def full(fd, data):
            if len(data) > 50:
                return real(fd, data[:50])  # the disk takes a part of it
            raise OSError(28, "No space left on device")

        monkeypatch.setattr(journals.os, "write", full)
        with pytest.raises(JournalError, match="No space left on device; the rows before are saved"):
            book.append(key(5), 5, {"width": 1.0}, row(5, error="x" * 40))
        monkeypatch.setattr(journals.os, "write", real)
    with Journal(path, SESSION) as book:
        assert "half-written" in book.notes[0]
        assert book.find(key(2)) is not None
        assert book.find(key(5)) is None


def test_reading_a_journal_gives_the_table(tmp_path):
    table = swept(tmp_path / "j")
    found = read_journal(tmp_path / "j")
    assert found.same_as(table)
    assert found.parameters == ("width", "height")


# --- kill -9 ----------------------------------------------------------------------------------------------


@pytest.mark.skipif(os.name == "nt", reason="needs SIGKILL")
def test_killed_at_random_moments_it_loses_and_repeats_nothing(tmp_path):
    random.seed(20)
    hits, rows = campaign(3, workers=0, folder=tmp_path)
    assert hits >= 2
    assert rows > 0
