"""The map as a Bokeh figure: one picture of the water, and the sheet's areas, lines and texts over it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from bokeh.core.properties import value
from bokeh.events import RangesUpdate, Tap
from bokeh.models import ColumnDataSource, LinearColorMapper, PanTool, Range1d, SingleIntervalTicker, WheelZoomTool
from bokeh.plotting import figure

from ..raster import View
from ..theme import Look, water_palette
from ..units import round_step
from .sheet import Sheet

_FONTS = {
    "atkinson": ("Atkinson Hyperlegible Next", "normal"), "bold": ("Atkinson Hyperlegible Next", "bold"),
    "literata": ("Literata", "italic"),
}
_FAR = 3.0  # times the mesh's size that a map may show


class MapFigure:
    """The map's models; ``show`` and ``turn_to`` change what they hold.

    Parameters
    ----------
    moved : callable, optional
        Called with the local (west, south, east, north) after the reader has panned or zoomed.
    pressed : callable, optional
        Called with the local x and y of a press on the map.
    beside : MapFigure, optional
        Another map, whose window this one shares.
    """

    def __init__(
        self, bounds: tuple[float, float, float, float], *, moved: Callable | None = None, pressed: Callable | None = None,
        beside: MapFigure | None = None,
    ) -> None:
        west, south, east, north = bounds
        size = max(east - west, north - south)
        self.x, self.y = (
            Range1d(start=low, end=high, min_interval=1.0, max_interval=_FAR * size) for low, high in ((west, east), (south, north))
        )
        if beside is not None:
            self.x, self.y = beside.x, beside.y
        self.figure = figure(
            name="map-figure" if beside is None else "twin-figure", x_range=self.x, y_range=self.y, sizing_mode="stretch_both", tools=[], toolbar_location=None,
            min_border=0, x_axis_location="below", output_backend="canvas",
        )
        pan, wheel = PanTool(), WheelZoomTool(zoom_on_axis=False)
        self.figure.add_tools(pan, wheel)
        self.figure.toolbar.active_drag, self.figure.toolbar.active_scroll = pan, wheel
        self.figure.toolbar.logo = None
        self._axes()
        place = "map" if beside is None else "twin"
        self.sources = {name: ColumnDataSource(data, name=f"{place}-{name}") for name, data in _empty().items()}
        self.colours = LinearColorMapper(palette=["#00000000"] * 256, low=0, high=255)
        self._glyphs()
        if moved is not None:
            self.figure.on_event(RangesUpdate, lambda e: moved((e.x0, e.y0, e.x1, e.y1)))
        if pressed is not None:
            self.figure.on_event(Tap, lambda e: pressed(e.x, e.y))

    def turn_to(self, view: View) -> None:
        """Show another window."""
        west, south, east, north = view.extent
        self.x.update(start=west, end=east)
        self.y.update(start=south, end=north)
        interval = max(round_step(view.width_m / 12), 0.1)
        for ticker in self.tickers:
            ticker.interval = interval

    def dress(self, look: Look) -> None:
        """Take a look's colours and weights."""
        p = look.palette
        self.colours.palette = list(water_palette(p))
        self.figure.update(
            background_fill_color=p.ground, border_fill_color=p.paper, outline_line_color=p.ink,
            outline_line_width=1.5 * look.line,
        )
        for axis in self.figure.axis:
            axis.update(major_tick_line_color=p.ink, minor_tick_line_color=p.ink, axis_line_color=p.ink)

    def show(self, sheet: Sheet | None, picture: np.ndarray | None, picture_view: View | None) -> None:
        """Put a drawn sheet and the water's bytes (rows from the south) on the map."""
        if picture is not None and picture_view is not None:
            west, south, _, _ = picture_view.extent
            self.sources["water"].data = {
                "image": [picture], "x": [west], "y": [south], "dw": [picture_view.width_m], "dh": [picture_view.height_m],
            }
        if sheet is None:
            return
        self.sources["under"].data = sheet.under
        self.sources["areas"].data = sheet.areas
        self.sources["over"].data = sheet.over
        for font in _FONTS:
            chosen = [i for i, f in enumerate(sheet.texts["font"]) if f == font]
            self.sources[font].data = {
                name: [_px(v[i]) if name == "size" else v[i] for i in chosen] for name, v in sheet.texts.items()
            }

    def lay(self, colours: np.ndarray | None, view: View | None) -> None:
        """Lay a backdrop, uint32 RGBA with rows from the south, under the water; None takes it away."""
        if colours is None or view is None:
            self.sources["ground"].data = _empty()["ground"]
            return
        west, south, _, _ = view.extent
        self.sources["ground"].data = {"image": [colours], "x": [west], "y": [south], "dw": [view.width_m], "dh": [view.height_m]}

    def clear(self) -> None:
        """Blank water and no marks: there is nothing to show."""
        for name, data in _empty().items():
            self.sources[name].data = data

    def _axes(self) -> None:
        f = self.figure
        f.add_layout(f.xaxis[0].clone(), "above")
        f.add_layout(f.yaxis[0].clone(), "right")
        self.tickers = [SingleIntervalTicker(interval=10, num_minor_ticks=5) for _ in f.axis]
        for axis, ticker in zip(f.axis, self.tickers):
            axis.update(
                ticker=ticker, major_label_text_font_size="0px",
                major_label_standoff=0, major_tick_in=9, major_tick_out=0, minor_tick_in=5, minor_tick_out=0,
                axis_line_width=0, minor_tick_line_width=1,
            )
            axis.major_label_text_alpha = 0
        f.grid.visible = False

    def _glyphs(self) -> None:
        f: Any = self.figure
        f.image_rgba("image", "x", "y", "dw", "dh", source=self.sources["ground"], level="image")
        f.image("image", "x", "y", "dw", "dh", source=self.sources["water"], color_mapper=self.colours, level="image")
        for name in ("under", "areas", "over"):
            if name == "areas":
                f.multi_polygons(
                    "xs", "ys", source=self.sources[name], fill_color="fill", fill_alpha="alpha", hatch_pattern="hatch",
                    hatch_color="hatch_colour", hatch_scale="hatch_scale", hatch_weight="hatch_weight", line_color="line",
                    line_width="width",
                )
            else:
                f.multi_line(
                    "xs", "ys", source=self.sources[name], line_color="colour", line_width="width", line_alpha="alpha",
                    line_dash="dash", line_cap="round", line_join="round",
                )
        for font, (family, weight) in _FONTS.items():
            f.text(
                "x", "y", "text", source=self.sources[font], text_color="colour", angle="angle",
                text_font=value(f"{family}, {'Georgia, serif' if font == 'literata' else 'system-ui, sans-serif'}"),
                text_font_style=weight, text_font_size="size", text_align="center", text_baseline="middle",
                background_fill_color="fill", background_fill_alpha="fill_alpha", border_line_color="border",
                border_line_dash="dash", padding=3, border_radius=2,
            )


def _empty() -> dict[str, dict]:
    blank = Sheet()
    texts = {font: dict(blank.texts) for font in _FONTS}
    water: dict[str, list] = {"image": [], "x": [], "y": [], "dw": [], "dh": []}
    return {"water": water, "ground": dict(water), "under": blank.under, "areas": blank.areas, "over": blank.over, **texts}


def _px(size: float) -> str:
    return f"{size:.1f}px"
