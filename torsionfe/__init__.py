"""Saint-Venant torsion of any cross-section, with proven bounds."""

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

__version__ = "0.1.0"

__all__ = [
    "InputError",
    "MeshError",
    "MissingExtraError",
    "Outline",
    "OutlineError",
    "ReadError",
    "SolveError",
    "TorsionError",
    "UnitError",
]
