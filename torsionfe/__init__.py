"""Saint-Venant torsion of any cross-section, with proven bounds.

The main job's names are imported at once; the others when they are first used, so that the import stays light.
"""

from importlib import import_module
from typing import TYPE_CHECKING

from torsionfe.closed_form.plates import Plate, PlateSet, PlateSum, plate_sum
from torsionfe.errors import (
    InputError,
    JobError,
    JournalError,
    MeshError,
    MissingExtraError,
    OutlineError,
    OutlineWarning,
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

if TYPE_CHECKING:
    from torsionfe.closed_form import exact
    from torsionfe.closed_form.cell_lines import thin_cells
    from torsionfe.closed_form.cells import CellSum, CellWall, ThinCells, cell_sum
    from torsionfe.closed_form.derive import derive_plates
    from torsionfe.closed_form.derived import DerivedPlates
    from torsionfe.closed_form.idealise import idealisations, plates_of
    from torsionfe.closed_form.rectangle import CoefficientTable, rectangle_coefficients
    from torsionfe.job.job import Job
    from torsionfe.job.reading import read_job
    from torsionfe.job.running import JobResult, run_job
    from torsionfe.member.bar import Bar, SteppedBar, TorqueCase
    from torsionfe.member.buckling import TorsionalBuckling, torsional_buckling
    from torsionfe.member.margins import Allowables, MarginTable, TorqueLimits, margins, torque_limits
    from torsionfe.member.plastic import PlasticTorque, plastic_torque
    from torsionfe.member.restrained import RestrainedBar, restrain
    from torsionfe.outline import shapes
    from torsionfe.outline.facets import RestoredArcs, restore_arcs
    from torsionfe.outline.files.read import ReadResult, read_outline, read_outline_report
    from torsionfe.outline.files.write import write_outline
    from torsionfe.outline.samples import sample
    from torsionfe.outline.shapes import TradeShape
    from torsionfe.output.boundary_plot import plot_boundary_stress
    from torsionfe.output.compare_plot import plot_comparison
    from torsionfe.output.contour import plot_stress
    from torsionfe.output.convergence import plot_convergence
    from torsionfe.output.fields import write_fields
    from torsionfe.output.figures import save_figure
    from torsionfe.output.outline_plot import plot_outline
    from torsionfe.output.plate_plot import plot_plates
    from torsionfe.output.range_plot import plot_range
    from torsionfe.output.result_json import to_json, write_json
    from torsionfe.output.sensitivity_plot import plot_sensitivity
    from torsionfe.output.sweep_map import plot_map
    from torsionfe.output.tables import csv_text, markdown_text, write_csv, write_markdown
    from torsionfe.output.warping_plot import plot_warping, plot_warping_surface
    from torsionfe.output.zoom import plot_hot_spot
    from torsionfe.study.compare import Comparison, compare
    from torsionfe.study.dimension import Sensitivity, sensitivity
    from torsionfe.study.hand import HandMethod
    from torsionfe.study.journal import read_journal
    from torsionfe.study.range import HandRange, hand_method_range
    from torsionfe.study.size import SizeResult, bar_margin, size
    from torsionfe.study.sweep import SweepInterrupted, sweep
    from torsionfe.study.sweep_table import SweepTable
    from torsionfe.torsion.corners import CornerStress
    from torsionfe.torsion.sensitivity import BoundarySensitivity, boundary_sensitivity

__version__ = "0.1.0"

#: Where the names that come later live; a test holds this to the imports that type checkers read above.
_LATER = {
    "closed_form": ("exact",),
    "closed_form.cell_lines": ("thin_cells",),
    "closed_form.cells": ("CellSum", "CellWall", "ThinCells", "cell_sum"),
    "closed_form.derive": ("derive_plates",),
    "closed_form.derived": ("DerivedPlates",),
    "closed_form.idealise": ("idealisations", "plates_of"),
    "closed_form.rectangle": ("CoefficientTable", "rectangle_coefficients"),
    "job.job": ("Job",),
    "job.reading": ("read_job",),
    "job.running": ("JobResult", "run_job"),
    "member.bar": ("Bar", "SteppedBar", "TorqueCase"),
    "member.buckling": ("TorsionalBuckling", "torsional_buckling"),
    "member.margins": ("Allowables", "MarginTable", "TorqueLimits", "margins", "torque_limits"),
    "member.plastic": ("PlasticTorque", "plastic_torque"),
    "member.restrained": ("RestrainedBar", "restrain"),
    "outline": ("shapes",),
    "outline.facets": ("RestoredArcs", "restore_arcs"),
    "outline.files.read": ("ReadResult", "read_outline", "read_outline_report"),
    "outline.files.write": ("write_outline",),
    "outline.samples": ("sample",),
    "outline.shapes": ("TradeShape",),
    "output.boundary_plot": ("plot_boundary_stress",),
    "output.compare_plot": ("plot_comparison",),
    "output.contour": ("plot_stress",),
    "output.convergence": ("plot_convergence",),
    "output.fields": ("write_fields",),
    "output.figures": ("save_figure",),
    "output.outline_plot": ("plot_outline",),
    "output.plate_plot": ("plot_plates",),
    "output.range_plot": ("plot_range",),
    "output.result_json": ("to_json", "write_json"),
    "output.sensitivity_plot": ("plot_sensitivity",),
    "output.sweep_map": ("plot_map",),
    "output.tables": ("csv_text", "markdown_text", "write_csv", "write_markdown"),
    "output.warping_plot": ("plot_warping", "plot_warping_surface"),
    "output.zoom": ("plot_hot_spot",),
    "study.compare": ("Comparison", "compare"),
    "study.dimension": ("Sensitivity", "sensitivity"),
    "study.hand": ("HandMethod",),
    "study.journal": ("read_journal",),
    "study.range": ("HandRange", "hand_method_range"),
    "study.size": ("SizeResult", "bar_margin", "size"),
    "study.sweep": ("SweepInterrupted", "sweep"),
    "study.sweep_table": ("SweepTable",),
    "torsion.corners": ("CornerStress",),
    "torsion.sensitivity": ("BoundarySensitivity", "boundary_sensitivity"),
}
_HOME = {name: module for module, names in _LATER.items() for name in names}

__all__ = [  # noqa: PLE0604 - what is starred is names, too
    "Bounds",
    "HotSpot",
    "InputError",
    "JobError",
    "JournalError",
    "MeshError",
    "MissingExtraError",
    "Outline",
    "OutlineError",
    "OutlineWarning",
    "Plate",
    "PlateSet",
    "PlateSum",
    "ReadError",
    "SolveError",
    "TorsionError",
    "TorsionSolution",
    "UnitError",
    "plate_sum",
    "solve_torsion",
    *_HOME,
]


if not TYPE_CHECKING:

    def __getattr__(name):
        if name not in _HOME:
            raise AttributeError(f"module 'torsionfe' has no attribute {name!r}")
        home = f"torsionfe.{_HOME[name]}"
        module = import_module(home)
        # a name that is a module itself (shapes, exact) becomes an attribute of its package when it is imported
        value = getattr(module, name) if hasattr(module, name) else import_module(f"{home}.{name}")
        globals()[name] = value
        return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
