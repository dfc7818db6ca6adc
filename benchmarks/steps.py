"""Time by step: wraps the solver's functions while a block runs; each second counts once, at the innermost step."""

import importlib
import time
from contextlib import contextmanager

#: Step, and the functions (by the module that calls them) whose own time it is.
STEPS = {
    "outline": [],  # (built by the caller)
    "triangulate": ["mesh.triangulate:triangulate"],
    "refine": ["torsion.solve:refined", "torsion.solve:_forced"],
    "number": ["torsion.fields:space_of", "torsion.fields:_stress_function_problem"],
    "assemble": ["torsion.fields:assemble"],
    "constrain": ["fem.solve:reduced"],
    "solve": ["fem.solve:solve_positive", "fem.solve:solve_multigrid"],
    "bound": ["torsion.fields:energies"],
    "peak": ["torsion.look:boundary_stress", "torsion.look:find_peaks"],
    "result": ["torsion.solve:TorsionSolution.of"],
}
OTHER = "other"


class Clock:
    """Seconds spent in each step, those of steps inside it left out."""

    def __init__(self):
        self.spent = dict.fromkeys([*STEPS, OTHER], 0.0)
        self._open = [OTHER]
        self._since = time.perf_counter()

    def _turn(self):
        now = time.perf_counter()
        self.spent[self._open[-1]] += now - self._since
        self._since = now

    def wrapped(self, function, step):
        """Return a function that does the same on this clock."""

        def timed(*given, **options):
            self._turn()
            self._open.append(step)
            try:
                return function(*given, **options)
            finally:
                self._turn()
                self._open.pop()

        return timed


@contextmanager
def clocked():
    """Give a `Clock` that runs while the block does."""
    clock, before = Clock(), []
    for step, places in STEPS.items():
        for place in places:
            module, path = place.split(":")
            owner = importlib.import_module(f"torsionfe.{module}")
            *outer, name = path.split(".")
            for part in outer:
                owner = getattr(owner, part)
            before.append((owner, name, owner.__dict__[name]))
            setattr(owner, name, clock.wrapped(getattr(owner, name), step))
    clock._since = time.perf_counter()
    try:
        yield clock
    finally:
        clock._turn()
        for owner, name, function in before:
            setattr(owner, name, function)
