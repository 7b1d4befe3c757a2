"""Tables of an adjustment for pandas, which is needed only here."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import chain
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from adjust.adjustment import Adjustment
from adjust.reports.libraries import library
from adjust.reports.records import Figures, line_figures, mark_figures, observation_figures
from adjust.reports.tables import flat_marks, flat_observations
from adjust.reports.verdict import cautions

if TYPE_CHECKING:
    import pandas

INDEX = {"marks": ["mark"], "lines": ["from", "to"], "observations": ["source"]}

TEXT = ("plan_status", "height_status", "description", "kind", "component", "at", "from", "to", "setup", "unit")


def frame(adjustment: Adjustment, table: Literal["marks", "lines", "observations"]) -> pandas.DataFrame:
    """See `Adjustment.to_frame`."""
    library_of_frames = library("pandas", "notebook")
    columns = _joined(_chunks(adjustment, table))
    made = library_of_frames.DataFrame({name: _column(name, cells) for name, cells in columns.items()})
    made.attrs = {"title": adjustment.job.title, "date": adjustment.job.date, "cautions": cautions(adjustment)}
    return made.set_index(INDEX[table]) if columns else made


def _chunks(adjustment: Adjustment, table: str) -> Iterable[Figures]:
    if table == "marks":
        return map(flat_marks, mark_figures(adjustment))
    if table == "lines":
        return map(flat_marks, line_figures(adjustment))
    return map(_with_truth, observation_figures(adjustment))


def _with_truth(figures: Figures) -> Figures:
    """The columns of `residuals.csv`, whether suspect as a truth value."""
    return flat_observations(figures) | {"suspect": figures["suspect"]}


def _joined(chunks: Iterable[Figures]) -> dict[str, list[Any]]:
    together = list(chunks)
    names = together[0] if together else ()
    return {name: list(chain.from_iterable(chunk[name] for chunk in together)) for name in names}


def _column(name: str, cells: list[Any]) -> Any:
    """Text, truth values, or else numbers with NaN where there is none."""
    if name in TEXT or name in ("mark", "source"):
        return np.array(cells, dtype=object)
    return np.array(cells, dtype=bool if name == "suspect" else float)
