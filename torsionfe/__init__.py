"""Saint-Venant torsion of any cross-section, with proven bounds."""

from torsionfe.closed_form.plates import Plate, plate_sum
from torsionfe.errors import (
    InputError,
    MeshError,
    MissingExtraError,
    OutlineError,
    ReadError,
    SolveError,
    TorsionError,
    UnitError,
)
from torsionfe.outline.outline import Outline
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.hot_spot import HotSpot
from torsionfe.torsion.solution import TorsionSolution
from torsionfe.torsion.solve import solve_torsion

__version__ = "0.1.0"

__all__ = [
    "Bounds",
    "HotSpot",
    "InputError",
    "MeshError",
    "MissingExtraError",
    "Outline",
    "OutlineError",
    "Plate",
    "ReadError",
    "SolveError",
    "TorsionError",
    "TorsionSolution",
    "UnitError",
    "plate_sum",
    "solve_torsion",
]
