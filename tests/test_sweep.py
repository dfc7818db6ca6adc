"""Sweeps: rows, errors, executors, lost workers, interrupts, and the table and maps that come out."""

import csv
import math
import os
import signal
import subprocess
import sys
import threading
import time
from concurrent.futures import Executor, Future, ProcessPoolExecutor, ThreadPoolExecutor
from multiprocessing import get_context
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import scipy.linalg  # noqa: F401 (so that its threads are there to be counted)

from torsionfe.closed_form.rectangle import rectangle_coefficients
from torsionfe.errors import InputError, OutlineError, SolveError
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes import angle, box, rectangle, regular, round_bar, wide_flange
from torsionfe.study.blas import _controls, one_thread
from torsionfe.study.crew import Crew, WorkerDiedError
from torsionfe.study.grid import combinations
from torsionfe.study.journal import read_journal
from torsionfe.study.sweep import SweepInterrupted, sweep
from torsionfe.study.work import NUMBERS, WORDS, Parcel, Settings, solve_parcel

#: Angles, two of which can't be, cheap to solve.
GRID = {"leg_x": [40.0, 50.0, 60.0], "leg_y": 50, "thickness": [5.0, 6.0, 65.0], "root_radius": 5.0}
LOOSE = {"rel_tol": 1e-2, "peak_tol": 0.05}


@pytest.fixture(scope="module")
def crew():
    with Crew(2) as workers:
        yield workers


@pytest.fixture(scope="module")
def reference():
    return sweep(GRID, angle, workers=0, **LOOSE)


def bars(count):
    return [rectangle(10.0 + k, 5.0) for k in range(count)]


# --- what is in the table ---------------------------------------------------------------------------------


def test_a_grid_runs_through_every_combination_the_last_parameter_fastest(reference):
    assert reference.parameters == ("leg_x", "leg_y", "thickness", "root_radius")
    assert reference["leg_x"].tolist() == [40.0, 40.0, 40.0, 50.0, 50.0, 50.0, 60.0, 60.0, 60.0]
    assert reference["thickness"].tolist() == [5.0, 6.0, 65.0] * 3
    assert reference["leg_y"].dtype == np.int64
    assert list(reference.columns) == [*reference.parameters, *NUMBERS, *WORDS]


def test_rows_hold_the_exact_answer_and_the_hand_methods(crew):
    """Rectangles against their series (Saint-Venant 1855)."""
    table = sweep({"width": [10.0, 20.0, 50.0], "height": 5.0}, rectangle, executor=crew)
    series = rectangle_coefficients(np.array([2.0, 4.0, 10.0]))
    exact = series.beta * table["width"] * 125.0
    assert (table["torsion_constant_lower"] <= exact).all()
    assert (exact <= table["torsion_constant_upper"]).all()
    assert table["hand_error"] == pytest.approx(0.0, abs=1e-3)
    assert table["section_modulus"] == pytest.approx(series.alpha * table["width"] * 25.0, rel=5e-3)
    assert table["stress_per_torque"] == pytest.approx(1.0 / table["section_modulus"])
    assert abs(table["hot_spot_y"]) == pytest.approx(2.5)
    assert table["area"] == pytest.approx(table["width"] * 5.0)
    assert (table["singular_corners"] == 0).all()
    assert (table["seconds"] > 0.0).all()


def test_hand_methods_of_tubes_and_of_outlines_without_any():
    plain = Outline([(0, 0), (3, 0), (0, 3)])
    table = sweep({"box": box(100, 60, 5), "bar": round_bar(10), "plain": plain}, workers=0, **LOOSE)
    assert table["name"].tolist() == ["box", "bar", "plain"]
    assert table["hand_method"].tolist() == ["thin cells", "", ""]
    # Bredt: 4 A^2 / (sum of l/t)
    assert table["hand_torsion_constant"][0] == pytest.approx(4.0 * (95.0 * 55.0) ** 2 / (300.0 / 5.0))
    assert np.isnan(table["hand_error"][1:]).all()
    assert table["singular_corners"].tolist() == [4, 0, 0]
    assert "unbounded in sharp re-entrant corners" in str(table)


def test_what_falls_short_is_said():
    table = sweep(bars(1), workers=0, rel_tol=1e-6, max_unknowns=500)
    assert table["status"].tolist() == ["not converged"]
    assert "the bracket of J is" in table["error"][0]
    assert table.solved.all()
    assert table["torsion_constant_lower"][0] < table["torsion_constant_upper"][0]


# --- bad sections -----------------------------------------------------------------------------------------


def test_one_bad_section_is_a_row_with_its_error(reference):
    bad = reference["thickness"] == 65.0
    assert (reference["status"][bad] == "failed").all()
    assert (reference["status"][~bad] == "ok").all()
    assert reference["error"][2] == "OutlineError: thickness 65 must be less than leg_x 40"
    assert np.isnan(reference["torsion_constant"][bad]).all()
    assert reference["leg_x"][2] == 40.0


def test_whatever_build_does_the_others_are_solved():
    def build(kind):
        if kind == "error":
            raise KeyError("W99")
        return {"none": None, "text": "outline"}.get(kind, rectangle(2.0, 1.0))

    table = sweep({"kind": ["error", "good", "none", "text"]}, build, workers=0, **LOOSE)
    assert table["status"].tolist() == ["failed", "ok", "failed", "failed"]
    assert table["error"][0] == "KeyError: 'W99'"
    assert "build must return an Outline, got None" in table["error"][2]


def test_what_is_no_outline_or_has_other_parameters_is_a_row():
    table = sweep([rectangle(2, 1), None, rectangle(3, 1)], workers=0, **LOOSE)
    assert table["status"].tolist() == ["ok", "failed", "ok"]
    assert "section 1 must be an Outline, got None" in table["error"][1]
    points = [{"width": 2.0, "height": 1.0}, {"width": 2.0}, {"height": 1.0, "width": 3.0}, 7]
    table = sweep(points, rectangle, workers=0, **LOOSE)
    assert table["status"].tolist() == ["ok", "failed", "ok", "failed"]
    assert "must have the parameters width, height, got width" in table["error"][1]


def test_an_unexpected_error_of_the_solver_is_a_row(monkeypatch):
    from torsionfe.study import work

    def broken(outline, *_, **__):
        raise ZeroDivisionError("a bug")

    monkeypatch.setattr(work, "solve_torsion", broken)
    table = sweep(bars(2), workers=0)
    assert table["error"].tolist() == ["ZeroDivisionError: a bug"] * 2


def test_an_error_of_the_iterable_ends_the_run_with_the_rows_saved(tmp_path):
    def outlines():
        yield from bars(2)
        raise OSError("the file of outlines ends here")

    with pytest.raises(OSError, match="ends here"):
        sweep(outlines(), workers=0, journal=tmp_path / "j", **LOOSE)
    assert len(read_journal(tmp_path / "j")) == 2


@pytest.mark.parametrize(
    ("outlines", "options", "said"),
    [
        (rectangle(2, 1), {}, "write \\[outline\\]"),
        ("file.dxf", {}, "iterable of outlines"),
        (7, {}, "iterable of outlines"),
        ({"width": [1.0]}, {}, "'width' is no Outline"),
        ({"width": []}, {"build": rectangle}, "'width' has no values"),
        ({}, {"build": rectangle}, "no parameters"),
        ({1: [2.0]}, {"build": rectangle}, "need names"),
        ({"area": [2.0]}, {"build": rectangle}, "can't be called 'area'"),
        ([rectangle(2, 1)], {"build": rectangle}, "each section is a mapping"),
        ([], {"build": "rectangle"}, "build must be a function"),
        ([], {"executor": 4}, "executor must be"),
        ([], {"workers": -1}, "workers must be"),
        ([], {"workers": True}, "workers must be"),
        ([], {"in_flight": 0}, "in_flight must be"),
        ([], {"rel_tol": 0.0}, "rel_tol"),
        ([], {"on_change": "ignore"}, "on_change must be one of"),
        ([], {"order": 9}, "order"),
        ([], {"max_unknowns": 0}, "max_unknowns"),
    ],
)
def test_bad_arguments_are_refused_before_any_work(outlines, options, said):
    with pytest.raises(InputError, match=said):
        sweep(outlines, **options)


def test_an_executor_and_workers_exclude_each_other():
    with ThreadPoolExecutor(1) as pool, pytest.raises(InputError, match="not both"):
        sweep([], executor=pool, workers=2)


def test_no_sections_are_an_empty_table():
    table = sweep([], workers=0)
    assert len(table) == 0
    assert "0 sections" in str(table)
    assert len(pd.DataFrame(table.columns)) == 0


# --- the same table everywhere ----------------------------------------------------------------------------


def test_every_executor_gives_the_same_bits(crew, reference, tmp_path):
    assert sweep(GRID, angle, executor=crew, journal=tmp_path / "j", **LOOSE).same_as(reference)
    assert sweep(GRID, angle, executor=crew, journal=tmp_path / "j", **LOOSE).same_as(reference)
    assert read_journal(tmp_path / "j").same_as(reference)
    with ThreadPoolExecutor(3) as pool:
        assert sweep(GRID, angle, executor=pool, **LOOSE).same_as(reference)


def test_every_order_gives_the_same_rows(crew, reference):
    points = list(combinations(GRID))
    order = np.random.default_rng(3).permutation(len(points))
    table = sweep([points[k] for k in order], angle, executor=crew, **LOOSE)
    for name in (*NUMBERS, *WORDS):
        if name != "seconds":
            np.testing.assert_array_equal(table[name], reference[name][order])


def test_same_as_sees_a_last_bit():
    first, second = (sweep(bars(1), workers=0, rel_tol=tol, peak_tol=1.0) for tol in (1e-2, 1e-5))
    assert first.same_as(first)
    assert not first.same_as(second)
    assert not first.same_as(sweep(bars(2), workers=0, **LOOSE))


def test_a_parcel_is_the_outline_and_its_digest_tells_it_from_others():
    shapes = [angle(50, 50, 5), angle(50, 50, 5, 3), box(50, 50, 5), box(50, 50, 6), wide_flange(100, 50, 5, 4, 3)]
    shapes += [Outline(shapes[0].vertices), Outline(shapes[2].vertices)]
    parcels = [Parcel.of(shape) for shape in shapes]
    assert len({parcel.digest() for parcel in parcels}) == len(shapes)
    for shape, parcel in zip(shapes, parcels, strict=True):
        assert parcel.opened() == shape
        assert type(parcel.opened()) is type(shape)
        assert parcel.digest() == Parcel.of(parcel.opened()).digest()


def test_linear_algebra_is_held_to_one_thread_and_let_go():
    def counts():
        return [get() for get, _ in _controls()]

    before = counts()
    with one_thread(), one_thread():
        assert set(counts()) <= {1}
    assert counts() == before


# --- workers that die -------------------------------------------------------------------------------------


def test_a_worker_that_dies_costs_its_own_task_alone():
    with Crew(1) as crew:
        good, bad, after = crew.submit(abs, -1), crew.submit(os._exit, 3), crew.submit(abs, -2)
        assert (good.result(), after.result()) == (1, 2)
        with pytest.raises(WorkerDiedError, match="ended with exit code 3"):
            bad.result()
        with pytest.raises(ZeroDivisionError):
            crew.submit(divmod, 1, 0).result()
        assert crew.submit(os.getenv, "OMP_NUM_THREADS").result() == "1"
        assert crew.submit(print, "not an answer").result() is None
        with pytest.raises(Exception, match=r"pickle|local object"):
            crew.submit(lambda: 1).result()
        assert crew.submit(abs, -3).result() == 3
    with pytest.raises(RuntimeError, match="shut down"):
        crew.submit(abs, -1)


@pytest.mark.parametrize("workers", [0, -1, True, 1.5])
def test_a_crew_needs_a_whole_number_of_workers(workers):
    with pytest.raises(InputError, match="workers must be a whole number above 0"):
        Crew(workers)


def test_a_crew_that_is_shut_down_drops_what_waits_if_asked():
    with Crew(1) as crew:
        busy = crew.submit(time.sleep, 0.3)
        waiting = [crew.submit(abs, -k) for k in range(5)]
        crew.shutdown(cancel_futures=True)
        assert busy.done()
        assert sum(future.cancelled() for future in waiting) >= 4


def test_a_containers_share_of_the_cores_counts(tmp_path, monkeypatch):
    from torsionfe.study import crew

    monkeypatch.setattr(crew, "_SHARE", tmp_path / "cpu.max")
    monkeypatch.setattr(crew.os, "sched_getaffinity", lambda _: set(range(8)), raising=False)
    assert crew.cores() == 8
    for text, count in (("max 100000\n", 8), ("150000 100000\n", 2), ("1000 100000\n", 1), ("3200000 100000", 8)):
        (tmp_path / "cpu.max").write_text(text)
        assert crew.cores() == count


class Unlucky(Executor):
    """Sends some sections to their death: as often as asked, by the number of their first try."""

    def __init__(self, crew, deaths):
        self.crew, self.deaths, self.seen = crew, dict(deaths), {}

    def submit(self, fn, parcel, settings):
        index = self.seen.setdefault(parcel.digest(), len(self.seen))
        if self.deaths.get(index, 0):
            self.deaths[index] -= 1
            return self.crew.submit(os._exit, 9)
        return self.crew.submit(fn, parcel, settings)


def test_a_section_that_kills_its_workers_is_tried_three_times_and_is_a_row(crew):
    table = sweep(bars(4), executor=Unlucky(crew, {1: 3, 2: 1}), **LOOSE)
    assert table["status"].tolist() == ["ok", "worker died", "ok", "ok"]
    assert "exit code 9 (3 times)" in table["error"][1]
    whole = sweep(bars(4), workers=0, **LOOSE)
    assert (table["torsion_constant"] == whole["torsion_constant"])[[0, 2, 3]].all()


def test_own_workers_killed_by_the_system_are_replaced(reference, crew):
    def points():
        for k, point in enumerate(combinations(GRID)):
            if k in (4, 7):
                os.kill(crew.pids[0], signal.SIGKILL)
            yield point

    assert sweep(points(), angle, executor=crew, **LOOSE).same_as(reference)


@pytest.mark.skipif(os.name == "nt", reason="needs fork")
def test_a_pool_that_breaks_is_replaced_by_local_workers_and_the_bits_are_the_same(reference):
    def points():
        for k, point in enumerate(combinations(GRID)):
            if k == 4:
                for pid in list(pool._processes):
                    os.kill(pid, signal.SIGKILL)
                time.sleep(0.2)
            yield point

    with ProcessPoolExecutor(1, get_context("forkserver")) as pool:
        table = sweep(points(), angle, executor=pool, in_flight=2, **LOOSE)
    assert table.same_as(reference)
    assert "the executor broke" in table.notes[0]


def test_an_executor_that_takes_nothing_is_an_error_of_ours():
    pool = ThreadPoolExecutor(1)
    pool.shutdown()
    with pytest.raises(SolveError, match="the executor takes no sections: RuntimeError"):
        sweep(bars(1), executor=pool)


def test_workers_that_cant_start_end_the_run(monkeypatch):
    monkeypatch.setattr(sys, "executable", "/no/such/python")
    with pytest.raises(SolveError, match="can't be started"):
        sweep(bars(1), workers=1)
    monkeypatch.setattr(sys, "frozen", True, raising=False)
    with pytest.raises(SolveError, match="frozen"):
        sweep(bars(1), workers=1)


def test_a_plain_script_without_a_guard_sweeps_and_its_workers_end_with_it(tmp_path):
    script = tmp_path / "script.py"
    script.write_text(
        f"import sys; sys.path[:] = {sys.path!r}\n"
        "import os, signal, time\n"
        "from torsionfe.study.crew import Crew\n"
        "from torsionfe.study.sweep import sweep\n"
        "from torsionfe.outline.shapes import rectangle\n"
        "crew = Crew(1)\n"
        "table = sweep({'width': [2.0, 3.0]}, lambda width: rectangle(width, 1.0), executor=crew)\n"
        "print(len(table), crew.pids[0], flush=True)\n"
        "os.kill(os.getpid(), signal.SIGTERM)\n"
    )
    run = subprocess.run([sys.executable, script], capture_output=True, text=True, timeout=60, check=False)
    rows, pid = map(int, run.stdout.split())
    assert rows == 2
    for _ in range(100):
        if not alive(pid):
            break
        time.sleep(0.05)
    assert not alive(pid)


def alive(pid):
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    # nobody may be there to collect a process that has ended
    status = Path(f"/proc/{pid}/stat")
    return not (status.exists() and status.read_text().rpartition(")")[2].split()[0] == "Z")


# --- interrupts, progress, memory -------------------------------------------------------------------------


@pytest.mark.parametrize("workers", [0, 1])
def test_ctrl_c_stops_with_all_finished_rows_saved(tmp_path, workers):
    def outlines():
        for k, bar in enumerate(bars(30)):
            if k == 8:
                signal.raise_signal(signal.SIGINT)
            yield bar

    with pytest.raises(KeyboardInterrupt, match=r"run again to go on") as caught:
        sweep(outlines(), workers=workers, journal=tmp_path / "j", **LOOSE)
    assert isinstance(caught.value, SweepInterrupted)
    table = caught.value.table
    assert 1 <= len(table) <= 9
    assert (table["status"] == "ok").all()
    assert table.notes == ("stopped by Ctrl-C",)
    assert table.same_as(read_journal(tmp_path / "j"))
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler
    whole = sweep(bars(12), workers=0, journal=tmp_path / "j", **LOOSE)
    assert whole.same_as(sweep(bars(12), workers=0, **LOOSE))


def test_a_second_ctrl_c_does_not_wait(tmp_path):
    def outlines():
        yield from bars(2)
        signal.raise_signal(signal.SIGINT)
        signal.raise_signal(signal.SIGINT)
        yield from bars(1)

    with pytest.raises(KeyboardInterrupt) as caught:
        sweep(outlines(), workers=0, journal=tmp_path / "j", **LOOSE)
    assert not isinstance(caught.value, SweepInterrupted)
    assert len(read_journal(tmp_path / "j")) == 2


def test_it_runs_outside_the_main_thread():
    found = []
    thread = threading.Thread(target=lambda: found.append(sweep(bars(2), workers=0, **LOOSE)))
    thread.start()
    thread.join()
    assert found[0].solved.all()


def test_progress_shows_rate_and_time_left_where_it_is_wanted(capsys):
    sweep({"width": [2.0, 3.0, -1.0]}, lambda width: rectangle(width, 1.0), workers=0, progress=True, **LOOSE)
    shown = capsys.readouterr().err
    assert "3/3" in shown
    assert "section/s" in shown
    assert "1 failed" in shown
    sweep(bars(1), workers=0, **LOOSE)
    sweep(bars(1), workers=0, progress=False, **LOOSE)
    assert capsys.readouterr().err == ""


class Patient(Executor):
    """Answers when it is asked to, by then the oldest, and knows how many wait."""

    def __init__(self):
        self.waiting, self.most = [], 0

    def submit(self, fn, *given):
        future = Future()
        self.waiting.append(lambda: future.set_result(fn(*given)))
        self.most = max(self.most, len(self.waiting))
        if len(self.waiting) == 5:
            self.waiting.pop(2)()
        return future


def test_a_generator_is_not_run_ahead_of():
    executor, drawn = Patient(), []

    def outlines():
        for k, bar in enumerate(bars(40)):
            drawn.append(len(executor.waiting))
            if k == 39:
                for answer in executor.waiting[::-1]:
                    answer()
                executor.waiting.clear()
            yield bar
        for answer in executor.waiting:
            answer()

    table = sweep(outlines(), executor=executor, in_flight=5, **LOOSE)
    assert executor.most == 5
    assert max(drawn) <= 4
    assert (np.diff(table["area"]) == 5.0).all()  # in the order in which they were given


def test_memory_per_row_is_small():
    table = sweep(({"width": 2.0 + (k % 3)} for k in range(300)), lambda width: None, workers=0)
    assert len(table) == 300
    assert sum(column.nbytes for column in table.columns.values()) / 300 < 250


# --- the table --------------------------------------------------------------------------------------------


def test_pandas_takes_the_columns_and_the_array(reference):
    for frame in (pd.DataFrame(reference.columns), pd.DataFrame(reference.array)):
        assert list(frame.columns) == list(reference.columns)
        assert frame["torsion_constant"].tolist()[0] == reference["torsion_constant"][0]
        assert frame["status"].tolist() == reference["status"].tolist()


def test_parameters_keep_their_type():
    points = [{"n": k, "w": 2.5, "on": k > 3, "label": f"s{k}", "size": np.float32(1.5)} for k in (3, 4)]
    table = sweep(points, lambda n, w, on, label, size: regular(n, w), workers=0, **LOOSE)
    kinds = [table[name].dtype.kind for name in ("n", "w", "on", "label", "size")]
    assert kinds == ["i", "f", "b", "O", "f"]


def test_values_of_a_grid_may_come_from_an_iterator():
    table = sweep({"width": (w for w in (2.0, 3.0)), "height": np.array([1.0, 1.5])}, rectangle, workers=0, **LOOSE)
    assert table["height"].tolist() == [1.0, 1.5, 1.0, 1.5]


def test_columns_are_read_only_and_unknown_ones_are_named(reference):
    with pytest.raises(ValueError, match="read-only"):
        reference["area"][0] = 1.0
    with pytest.raises(InputError, match="no column 'J', only leg_x"):
        reference["J"]


def test_csv_keeps_every_digit(reference, tmp_path):
    path = reference.save_csv(tmp_path / "table.csv")
    with open(path, newline="") as file:
        rows = list(csv.DictReader(file))
    assert [row["error"] for row in rows] == reference["error"].tolist()
    assert rows[2]["torsion_constant"] == ""
    assert [float(row["torsion_constant"] or "nan") for row in rows] == pytest.approx(
        reference["torsion_constant"], rel=0.0, abs=0.0, nan_ok=True
    )


def test_printed_it_shows_rows_and_errors(reference):
    text = str(reference)
    assert text.startswith("Sweep: 9 sections, 6 ok, 3 failed\n")
    assert "row 2: OutlineError: thickness 65 must be less than leg_x 40" in text
    assert repr(reference) == "<SweepTable 9 sections, 6 ok, 3 failed>"


# --- maps -------------------------------------------------------------------------------------------------


def test_a_map_has_a_cell_for_each_section(reference):
    drawn = reference.plot(value="hand_error", unit="mm")
    assert drawn.axes.get_xlabel() == "leg x [mm]"
    assert drawn.axes.get_ylabel() == "thickness [mm]"
    shown = drawn.cells.get_array()
    assert shown.shape == (3, 3)
    assert shown.mask[2].all()  # no such angles
    assert shown[1, 2] == pytest.approx(100.0 * reference["hand_error"][7])
    assert len(drawn.labels) == 6
    assert drawn.bar.ax.get_ylabel() == "error of the hand method's J [%]"


def test_a_curve_over_one_parameter(reference):
    drawn = reference.plot(at={"thickness": 6.0})
    assert drawn.lines[0].get_xdata().tolist() == [40.0, 50.0, 60.0]
    assert drawn.lines[0].get_ydata().tolist() == reference["torsion_constant"][1::3].tolist()
    assert drawn.axes.get_title(loc="left") == "thickness 6.0"


@pytest.mark.parametrize(
    ("options", "said"),
    [
        ({"x": "depth"}, "'depth' is no parameter"),
        ({"value": "status"}, "no column of numbers"),
        ({"value": "leg_x"}, "no column of numbers"),
        ({"at": {"thickness": 7.0}}, "no section has thickness = 7.0; there are 5.0, 6.0, 65.0"),
        ({"at": {"thickness": 6.0, "leg_x": 40.0}}, "no parameter varies"),
        ({"at": {"thickness": 65.0}}, None),
    ],
)
def test_maps_that_cant_be_drawn_say_why(reference, options, said):
    if said is None:  # nothing but failures: a curve without points is no error
        assert np.isnan(reference.plot(**options).lines[0].get_ydata()).all()
        return
    with pytest.raises(InputError, match=said):
        reference.plot(**options)


def test_what_else_varies_must_be_held():
    grid = {"width": [2.0, 3.0], "height": [1.0, 1.5], "corner_radius": [0.0, 0.1]}
    table = sweep(grid, rectangle, workers=0, **LOOSE)
    with pytest.raises(InputError, match="corner_radius vary, too: hold them"):
        table.plot()
    with pytest.raises(InputError, match="corner_radius vary"):
        table.plot(x="width", y="height")
    assert table.plot(at={"corner_radius": 0.1}).cells.get_array().shape == (2, 2)
    with pytest.raises(InputError, match="several sections have the same width"):
        sweep([{"width": 2.0}, {"width": 3.0}, {"width": 2.0}], lambda width: rectangle(width, 1), workers=0).plot()


# --- a cluster --------------------------------------------------------------------------------------------


@pytest.mark.filterwarnings("ignore")
@pytest.mark.skipif(os.name == "nt", reason="kills a process")
def test_a_cluster_of_dask_gives_the_same_bits_though_a_worker_is_killed(reference, tmp_path):
    """A scheduler and two workers of their own processes on the loopback interface; one is killed in mid-run."""
    distributed = pytest.importorskip("distributed")
    killed = []

    def points():
        for k, point in enumerate(combinations(GRID)):
            if k == 5:
                name = next(iter(client.scheduler_info()["workers"]))
                pid = client.run(os.getpid, workers=[name])[name]
                os.kill(pid, signal.SIGKILL)
                killed.append(pid)
            yield point

    options = {"n_workers": 2, "threads_per_worker": 1, "dashboard_address": None, "local_directory": str(tmp_path)}
    with (
        distributed.LocalCluster(host="127.0.0.1", silence_logs=50, **options) as cluster,
        distributed.Client(cluster) as client,
        client.get_executor() as executor,
    ):
        table = sweep(points(), angle, executor=executor, in_flight=3, **LOOSE)
        with pytest.raises(InputError, match=r"client\.get_executor"):
            sweep([], executor=client)
    assert killed
    assert table.same_as(reference)


def test_settings_are_checked_once_and_travel_with_each_section():
    row = solve_parcel(Parcel.of(rectangle(2, 1)), Settings(1e-2, 1, math.inf, 10_000))
    assert row["status"] == "ok"
    with pytest.raises(InputError, match="order"):
        Settings(1e-2, 7, math.inf, 10_000)
    assert issubclass(OutlineError, InputError)
