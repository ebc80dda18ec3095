"""Field observations beside the model: their table, and what the map shows of them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from hydro.observations import Observed

from ..text import safe
from ..units import Units
from . import table
from .scene import LineMark, PointMark, Tag


def html(found: Sequence[Observed], units: Units) -> str:
    """One row an observation: model minus observed, or the separation of a drogue from its parcel; empty without any."""
    if not found:
        return ""
    columns = (
        table.Column("Observed", figure=False), table.Column("Compared"), table.Column("Mean,", "bias"), table.Column("RMSE"), table.Column("Worst"),
        table.Column("Unit", figure=False),
    )
    lines = []
    for o in found:
        f = o.figures
        what = "separation" if o.kind in ("drogue", "dye") else "model minus observed"
        more = [f"skill {f['skill']:.2f}"] if f.get("skill") is not None else []
        within = f.get("within_accuracy")
        more += [f"{100 * within:.0f}\u00a0% within the accuracy given"] if within is not None else []
        lines.append(table.Line((
            (safe(o.name), "; ".join([f"{o.kind}, {what}", *more])), (f"{int(f['count'] or 0)}", ""),
            *((units.number(f[name], o.unit), "") for name in ("bias", "rmse", "worst")), (units.label(o.unit), safe(o.source)),
        )))
    return table.html(table.Table("Observed in the field", "", "Field observations beside the model", columns, lines))


def marks(found: Sequence[Observed], units: Units) -> tuple[list[PointMark], list[LineMark], list[Tag]]:
    """Rings with their difference at marks; a drogue's track dotted and its parcel's path solid."""
    points, lines, tags = [], [], []
    for o in found:
        if o.xy is None:
            continue
        if o.kind == "drogue":
            lines.append(LineMark("dotted", o.xy))
            points.append(PointMark("drogue", o.xy[0]))
            if o.model_xy is not None:
                known = np.isfinite(o.model_xy[:, 0])
                lines.append(LineMark("pathline", o.model_xy[known]))
            tags.append(Tag(o.name, (float(o.xy[-1, 0]), float(o.xy[-1, 1]))))
            continue
        for at, difference in zip(o.xy, o.difference, strict=True):
            points.append(PointMark("rest", at))
            sign = "+" if difference > 0 else ""
            tags.append(Tag(f"{sign}{units.quantity(float(difference), o.unit, digits=2)}", (float(at[0]), float(at[1]))))
    return points, lines, tags
