"""One raster on a page: what it is asked for, and what it comes to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Protocol

from atlas.config.jobs import Plate
from atlas.figure.lettering import axis_text, plain
from atlas.figure.pieces import PanelText, Raster
from atlas.orbits.schedule import Schedule
from atlas.output.reporter import Reporter
from tiles.values import ValueFit
from tiles.window import Axis


@dataclass(frozen=True)
class View:
    """One raster to be made.

    Attributes
    ----------
    name : str
        On the page.
    plate : Plate
    columns, rows : int
        Its pixels.
    fit : ValueFit, optional
        Of the panel whose magnified part it is, so that one colour key holds for both.
    """

    name: str
    plate: Plate
    columns: int
    rows: int
    fit: ValueFit | None = None

    @property
    def cells(self) -> int:
        """Pixels of the raster."""
        return self.columns * self.rows


@dataclass(frozen=True)
class Panel:
    """What a view comes to.

    Attributes
    ----------
    raster : Raster
    text : PanelText
    shares : mapping of str to number
        What is not seen, and why.
    sampled : mapping of str to int
        What was computed, for the certificate.
    samples : int
        Samples or pixels in all.
    digest : str
        Of the numbers behind the picture.
    remarks : tuple of str
        What must not go unsaid.
    fit : ValueFit, optional
        Of a picture of values.
    """

    raster: Raster
    text: PanelText
    shares: Mapping[str, Any]
    sampled: Mapping[str, Any]
    samples: int
    digest: str
    remarks: tuple[str, ...] = ()
    fit: ValueFit | None = None


@dataclass(frozen=True)
class Room:
    """What a view needs while it is made.

    Attributes
    ----------
    samples : int
        Samples or pixels, at least.
    working : int
        Bytes that are alive beside the finished rasters at the peak.
    raster : int
        Bytes of the finished raster.
    each_worker : int
        Bytes that every thread works with, and that wait for their turn.
    """

    samples: int
    working: int
    raster: int
    each_worker: int = 0


class Maker(Protocol):
    """Makes the views of one kind."""

    def room(self, view: View) -> Room:
        """Return what a view needs; refuses what cannot be computed."""

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core; formulas are read closely for it."""

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Compute and colour a view; ``name`` is the output's, for the reporter."""


def label_of(plate: Plate, axis: Axis) -> str:
    """Return an axis' label: the config's own, else the family's label, symbol and unit."""
    if axis.label:
        return plain(axis.label)
    return axis_text(axis.name, *plate.family.label_and_unit(axis.name))
