"""What stands on a plotter: surfaces, lines, labels, texts, each by its name.

Surfaces and lines that hang on the plate are lifted with its deflection; while
something is dragged those that are many are hidden, and a plate of many triangles is
stood for by few.
"""

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np

from kplate.arrays import Floats, Ints
from kplate.output.colours import BEYOND, Colours
from kplate.output.strokes import FIXED, Label, Strokes
from kplate.output.thinning import thinned

INK, FAINT = "#1a1a1a", "#6b6b6b"
HEAVY, FEW = 50_000, 20_000  # triangles from which on a plate is stood for by so many
LABELS = "labels-labels"  # their name on the plotter
HAIR = 5e-4  # of the size, between the plate and its back
TEXT = 12  # size of letters in pixels
LINE = 13  # letters of a line over the bar
LIGHT = (0.72, 0.28)  # ambient and diffuse: mostly flat light, or the colours would lie


@dataclass(eq=False, kw_only=True)
class Layer:
    """One surface or set of lines, and how it hangs on the plate.

    Parameters
    ----------
    data : pyvista.PolyData
        Its points are moved.
    height : ndarray, shape (n,)
        Height of the points over the undeflected plate.
    hung : ndarray, shape (n,)
        Deflection in m by which they move, 0 where they do not.
    stays : bool
        Whether it is shown while something is dragged.
    """

    data: Any
    height: Floats
    hung: Floats
    stays: bool

    def lift(self, scale: float) -> None:
        """Draw the deflection this many times larger."""
        self.data.points[:, 2] = self.height + scale * self.hung
        self.data.Modified()


class Props:
    """Puts things on a plotter and keeps them in step with the deflection.

    Parameters
    ----------
    plotter : pyvista.Plotter
        Where; its active renderer.
    points : ndarray, shape (n, 3)
        Points of the plate.
    triangles : ndarray, shape (m, 3)
        Its triangles.
    columns : tuple of int
        Parts of the plotter in which the plate stands, and the bar of colours.
    """

    def __init__(
        self, plotter: Any, points: Floats, triangles: Ints, columns: tuple[int, int]
    ) -> None:
        self.plotter, self.columns = plotter, columns
        self.points, self.triangles = points, triangles
        self.w = np.zeros(len(points))
        self.scale = 1.0
        self.layers: dict[str, Layer] = {}
        self.dragging = False
        self._few: tuple[Ints, Ints] | None = None
        self._smooth = 0

    @property
    def is_heavy(self) -> bool:
        """Whether the plate has too many triangles to be dragged as it is."""
        return len(self.triangles) > HEAVY

    @property
    def few(self) -> tuple[Ints, Ints]:
        """Points and triangles that stand for all, see `thinned`."""
        if self._few is None:
            self._few = thinned(self.points[:, :2], self.triangles, FEW)
        return self._few

    def surface(self, title: str, values: Floats, colours: Colours) -> None:
        """Colour the plate by values at its points."""
        table = lookup(colours)
        every = np.arange(len(self.points))
        parts = [("plate", every, self.triangles)]
        if self.is_heavy:
            parts.append(("few", *self.few))
        for name, kept, triangles in parts:
            layer = self._layer(name, kept, triangles)
            layer.hung = self.w[kept]
            layer.lift(self.scale)
            layer.data.point_data.clear()
            layer.data.point_data[title] = values[kept].astype(np.float32)
            self.plotter.add_mesh(
                layer.data,
                name=name,
                scalars=title,
                cmap=table,
                clim=list(colours.limits),
                reset_camera=False,
                show_scalar_bar=False,
                render=False,
            )
        self._back()
        self._show_parts()

    def _back(self) -> None:
        """Draw the plate once more a hair lower.

        Where small triangles of one size meet those of another there are cracks,
        through which white would show.
        """
        self.plotter.remove_actor("back", render=False)
        if self.is_heavy:
            return
        import pyvista

        front = self.plotter.actors["plate"]
        actor = pyvista.Actor(mapper=front.mapper, prop=front.prop)
        actor.SetPosition(0.0, 0.0, -HAIR * float(np.ptp(self.points, axis=0).max()))
        self.plotter.add_actor(
            actor, name="back", pickable=False, reset_camera=False, render=False
        )

    def _layer(self, name: str, kept: Ints, triangles: Ints) -> Layer:
        if name not in self.layers:
            import pyvista

            points: Any = self.points[kept].astype(np.float32)
            faces: Any = triangles
            data = pyvista.PolyData.from_regular_faces(points, faces)
            self.layers[name] = Layer(
                data=data,
                height=np.zeros(len(kept)),
                hung=self.w[kept],
                stays=name == "few" or not self.is_heavy,
            )
        return self.layers[name]

    def bar(self, title: str, colours: Colours) -> None:
        """Explain the colours: figures where two of them meet."""
        plotter = self.plotter
        for old in list(plotter.scalar_bars.keys()):
            plotter.remove_scalar_bar(old, render=False)
        mapper = plotter.actors["plate"].mapper
        words = {}
        if colours.above:
            words["above_label"] = "left out"
        if colours.below:
            words["below_label"] = "left out"
        plotter.subplot(0, self.columns[1])
        bar = plotter.add_scalar_bar(
            title="\n".join(textwrap.wrap(title, LINE)),
            mapper=mapper,
            vertical=True,
            position_x=0.45,
            position_y=0.16,
            height=0.6,
            width=0.5,
            n_labels=len(colours.levels),
            n_colors=len(colours.bands),
            fmt="%.4g",
            color=INK,
            title_font_size=13,
            label_font_size=13,
            render=False,
            **words,
        )
        plotter.subplot(0, self.columns[0])
        bar.SetVerticalTitleSeparation(14)
        for letters in (
            bar.GetTitleTextProperty(),
            bar.GetLabelTextProperty(),
            bar.GetAnnotationTextProperty(),
        ):
            letters.SetFontFamily(4)  # a file
            letters.SetFontFile(font_file())

    def strokes(
        self,
        name: str,
        strokes: Strokes,
        *,
        colour: str,
        width: float = 2.0,
        stays: bool = True,
    ) -> None:
        """Draw strokes, or take them off where there are none."""
        hung = np.where(strokes.anchors == FIXED, 0.0, self.w[strokes.anchors])
        self.lines(name, strokes.ends, hung, colour=colour, width=width, stays=stays)

    def lines(
        self,
        name: str,
        ends: Floats,
        hung: Floats,
        *,
        colour: str,
        width: float = 2.0,
        stays: bool = True,
    ) -> None:
        """Draw segments (k, 2, 3) whose ends hang on deflections (k, 2)."""
        self.remove(name)
        if not len(ends):
            return
        import pyvista

        points = ends.reshape(-1, 3)
        pairs = np.arange(len(points)).reshape(-1, 2)
        cells = np.column_stack([np.full(len(pairs), 2), pairs])
        layer = Layer(
            data=pyvista.PolyData(points.astype(np.float32), lines=cells.ravel()),
            height=points[:, 2].copy(),
            hung=hung.ravel(),
            stays=stays or not self.is_heavy,
        )
        layer.lift(self.scale)
        self.layers[name] = layer
        actor = self.plotter.add_mesh(
            layer.data,
            name=name,
            color=colour,
            line_width=width,
            lighting=False,
            reset_camera=False,
            render=False,
        )
        # Lines on a surface are drawn in front of it.
        actor.mapper.SetResolveCoincidentTopologyToPolygonOffset()
        actor.mapper.SetRelativeCoincidentTopologyLineOffsetParameters(0.0, -40.0)
        self._show_parts()

    def dots(
        self, name: str, places: Floats, anchors: Ints, *, colour: str, size: float
    ) -> None:
        """Draw points (k, 3) that hang on points of the plate."""
        self.remove(name)
        if not len(places):
            return
        import pyvista

        hung = np.where(anchors == FIXED, 0.0, self.w[anchors])
        layer = Layer(
            data=pyvista.PolyData(places.astype(np.float32)),
            height=places[:, 2].copy(),
            hung=hung,
            stays=True,
        )
        layer.lift(self.scale)
        self.layers[name] = layer
        self.plotter.add_points(
            layer.data,
            name=name,
            color=colour,
            point_size=size,
            render_points_as_spheres=True,
            reset_camera=False,
            render=False,
        )

    def labels(self, labels: Sequence[Label]) -> None:
        """Write texts at their places; what would run into another waits for a zoom."""
        self.plotter.remove_actor(LABELS, render=False)
        if not labels:
            return
        places = self.places(labels)
        actor = self.plotter.add_point_labels(
            places,
            [label.text for label in labels],
            name=LABELS.partition("-")[0],
            font_size=TEXT + 1,
            font_file=font_file(),
            text_color=INK,
            shape_color="white",
            shape_opacity=0.75,
            margin=2,
            show_points=False,
            always_visible=True,
            reset_camera=False,
            render=False,
        )
        actor.SetVisibility(not (self.dragging and self.is_heavy))

    def places(self, labels: Sequence[Label]) -> Floats:
        """Where labels stand now, (k, 3)."""
        found = np.array([label.place for label in labels]).reshape(-1, 3)
        for place, label in zip(found, labels, strict=True):
            if label.anchor != FIXED:
                place[2] += self.scale * self.w[label.anchor]
        return found

    def text(self, name: str, words: str, where: str, *, size: int = TEXT) -> None:
        """Write in a corner; nothing takes it off."""
        if not words:
            self.plotter.remove_actor(name, render=False)
            return
        self.plotter.add_text(
            words,
            name=name,
            position=where,
            font_size=size,
            font_file=font_file(),
            color=INK,
            render=False,
        )

    def remove(self, name: str) -> None:
        """Take something off."""
        self.layers.pop(name, None)
        self.plotter.remove_actor(name, render=False)

    def lift(self, scale: float) -> None:
        """Draw the deflection this many times larger; what is hidden waits."""
        self.scale = scale
        for layer in self.layers.values():
            if layer.stays or not self.dragging:
                layer.lift(scale)

    def drag(self, *, on: bool) -> None:
        """Begin or end a drag: few for many, rough for smooth edges, and back."""
        self.dragging = on
        window = self.plotter.render_window
        if on:
            self._smooth = window.GetMultiSamples() or self._smooth
        window.SetMultiSamples(0 if on else self._smooth)
        if not on:
            self.lift(self.scale)
        self._show_parts()

    def _show_parts(self) -> None:
        actors = self.plotter.actors
        thin = self.dragging and self.is_heavy
        for name, layer in self.layers.items():
            if name in actors:
                shown = layer.stays if thin else name != "few"
                actors[name].SetVisibility(shown)
        if LABELS in actors:
            actors[LABELS].SetVisibility(not thin)


def lookup(colours: Colours) -> Any:
    """Colours as VTK looks them up."""
    import pyvista

    table = pyvista.LookupTable()
    bands = np.column_stack([colours.bands, np.ones(len(colours.bands))])
    table.values = np.rint(255.0 * bands).astype(np.uint8)
    table.scalar_range = colours.limits
    if colours.above:
        table.above_range_color = BEYOND
    if colours.below:
        table.below_range_color = BEYOND
    return table


@cache
def font_file() -> str:
    """Letters that every machine has, as they come with matplotlib."""
    from pathlib import Path

    import matplotlib

    return str(Path(matplotlib.get_data_path()) / "fonts" / "ttf" / "DejaVuSans.ttf")
