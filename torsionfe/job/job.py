"""What a job file describes, read and checked."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from torsionfe.closed_form.plates import Plate
from torsionfe.job.places import InputFile, digest_of
from torsionfe.job.section import JobSection
from torsionfe.job.table import Stated
from torsionfe.member.bar import TorqueCase
from torsionfe.member.margins import Allowables
from torsionfe.quantities import UnitSystem

__all__ = [
    "Column",
    "Hand",
    "Heading",
    "Job",
    "JobBar",
    "Material",
    "Outputs",
    "Segment",
    "SensitivityPlan",
    "SheetChoice",
    "SweepPlan",
    "Tolerance",
]


@dataclass(frozen=True, slots=True)
class Heading:
    """Who and what: the block at the top of the sheet, all of it text as the job gives it."""

    title: str
    author: str = ""
    checker: str = ""
    revision: str = ""
    date: str = ""
    remarks: str = ""


@dataclass(frozen=True, slots=True)
class Material:
    """Stiffness and strengths, and where they come from.

    Attributes
    ----------
    name, source : str
    shear_modulus, elastic_modulus : float or None
        force / length**2.
    allowables : Allowables or None
        Strengths of the material and allowed twist of the bar.
    """

    name: str = ""
    source: str = ""
    shear_modulus: float | None = None
    allowables: Allowables | None = None
    elastic_modulus: float | None = None


@dataclass(frozen=True, slots=True)
class Segment:
    """A piece of the bar.

    Attributes
    ----------
    name : str
    length : float
    shear_modulus : float
        force / length**2.
    section : JobSection or None
        None for the job's own.
    """

    name: str
    length: float
    shear_modulus: float
    section: JobSection | None = None


@dataclass(frozen=True, slots=True)
class JobBar:
    """The bar: its segments from station 0 on, the stations that cannot rotate, and the ends that cannot warp.

    Attributes
    ----------
    segments : tuple of Segment
    held : tuple of int
    warping_held : {'', 'near', 'both'}
    """

    segments: tuple[Segment, ...]
    held: tuple[int, ...] = (0,)
    warping_held: str = ""


@dataclass(frozen=True, slots=True)
class Column:
    """The bar under compression.

    Attributes
    ----------
    length : float
    length_factor : float
    force : float or None
        Compression to set against the buckling load.
    """

    length: float
    length_factor: float = 1.0
    force: float | None = None


@dataclass(frozen=True, slots=True)
class Hand:
    """What the hand method is asked for.

    Attributes
    ----------
    plates : str or tuple of Plate
        ``'auto'``, ``'shape'``, ``'derive'``, ``'none'``, or the plates themselves.
    idealisations : tuple of str
        The first one is drawn.
    rule : str
        Of the coefficients.
    """

    plates: str | tuple[Plate, ...] = "auto"
    idealisations: tuple[str, ...] = ("centreline",)
    rule: str = "series"


@dataclass(frozen=True, slots=True)
class SensitivityPlan:
    """What to vary, and by how much.

    Attributes
    ----------
    step : float
        Length.
    of : tuple of str
        Dimensions of the trade shape; none for an outline that is no trade shape as stated.
    """

    step: float
    of: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Tolerance:
    """How sure the answer has to be."""

    torsion_constant: float = 1e-3
    peak_stress: float = 2e-3
    order: int = 2
    most_unknowns: int = 300_000


@dataclass(frozen=True, slots=True)
class SheetChoice:
    """Paper and sections of the sheet."""

    paper: str
    sections: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Outputs:
    """Which files to write."""

    html: bool = True
    pdf: bool = True
    json: bool = True
    csv: bool = False
    fields: bool = False
    figures: tuple[str, ...] = ("svg",)


@dataclass(frozen=True, slots=True)
class SweepPlan:
    """Dimensions of the trade shape to vary, each with its values (length, or plain numbers), and what to draw."""

    grid: Mapping[str, tuple[float, ...]]
    maps: tuple[str, ...]


@dataclass(frozen=True)
class Job:
    """A job: what to compute and how to show it. `torsionfe.job.reading.read_job` makes one.

    Attributes
    ----------
    path : pathlib.Path
    heading : Heading
    system : UnitSystem
        Every number is in it.
    section : JobSection
    material : Material
    cases : tuple of TorqueCase
    bar : JobBar or None
    column : Column or None
    hand : Hand
    sensitivity : SensitivityPlan
    tolerance : Tolerance
    sheet : SheetChoice
    outputs : Outputs
    sweep : SweepPlan or None
    stated : tuple of Stated
        Every number of the job file, as it stands there.
    files : tuple of InputFile
        The job file, then the files that it names.
    """

    path: Path
    heading: Heading
    system: UnitSystem
    section: JobSection
    material: Material
    cases: tuple[TorqueCase, ...]
    bar: JobBar | None
    column: Column | None
    hand: Hand
    sensitivity: SensitivityPlan
    tolerance: Tolerance
    sheet: SheetChoice
    outputs: Outputs
    sweep: SweepPlan | None
    stated: tuple[Stated, ...]
    files: tuple[InputFile, ...]

    @property
    def digest(self) -> str:
        """SHA-256 over the digests of all input files."""
        return digest_of(self.files)
