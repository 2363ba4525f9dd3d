"""One spectrum in four plots that share a cursor: modulus, phase, complex plane, residuals.

The plots keep their items and give them other data; an item that went away while its own click is
being delivered would take the program with it. For the same reason clicks are found here, by the
nearest point on the screen, and not by the items.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QEvent, QObject, QPointF, QRectF, Qt, Signal
from PySide6.QtGui import QColor, QFocusEvent, QKeyEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QGridLayout, QWidget

from coatgui.fitting.views import FitBand, Part
from coatgui.records import Fit, Spectrum
from coatgui.window.canvas import Canvas, Curve, Line, Marks
from coatgui.window.fit_drawn import FitDrawn
from coatgui.window.key import Entry, Key
from coatgui.window.numbers import prefixed
from coatgui.window.palette import Colours, time_colour

_REACH_PX = 14.0


@dataclass(frozen=True, eq=False)
class Drawn:
    """A spectrum to draw: its fit, if any, and which points are used."""

    spectrum: Spectrum
    fit: Fit | None
    used: np.ndarray

    def places(self) -> tuple[tuple[np.ndarray, np.ndarray], ...]:
        """Across and up, for modulus, phase, complex plane and residual (real part)."""
        z, x = self.spectrum.impedance_ohm, np.log10(self.spectrum.frequency_hz)
        residual = self.residual()
        off = np.full(x.size, np.nan) if residual is None else residual.real
        return (
            (x, np.log10(np.maximum(np.abs(z), 1e-30))),
            (x, np.degrees(np.angle(z))),
            (z.real, -z.imag),
            (x, off),
        )

    def residual(self) -> np.ndarray | None:
        """(Z − Z_model)/|Z| in percent, complex."""
        if self.fit is None:
            return None
        z = self.spectrum.impedance_ohm
        return np.asarray(100.0 * (z - self.fit.modelled_ohm) / np.maximum(np.abs(z), 1e-30))


class SpectrumPlots(QWidget):
    """`toggled` carries the points to leave out or take back; `pointed` says in words what stands
    under the cursor. With the keyboard: left and right move the cursor, space leaves the point out
    or takes it back."""

    toggled = Signal(list)
    pointed = Signal(str)

    def __init__(self) -> None:
        super().__init__()
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("Spectrum: modulus, phase, complex plane and residuals")
        self.setAccessibleDescription(
            "Left and right move the cursor; space leaves the point out or takes it back."
        )
        self.modulus = Canvas(
            "Bode plot of the modulus", ("frequency", "Hz"), ("|Z| of the specimen", "Ω")
        )
        self.phase = Canvas("Bode plot of the phase", ("frequency", "Hz"), ("phase / °", None))
        self.plane = Canvas("Complex plane", ("Z′", "Ω"), ("−Z″", "Ω"), decades=False, even=True)
        self.residual = Canvas("Residuals", ("frequency", "Hz"), ("residual / %", None))
        self.plots = (self.modulus, self.phase, self.plane, self.residual)
        self.phase.share_across(self.modulus)
        self.residual.share_across(self.modulus)
        grid = QGridLayout(self)
        grid.setContentsMargins(2, 2, 2, 2)
        grid.setSpacing(8)
        for place, plot in enumerate((self.modulus, self.plane, self.phase, self.residual)):
            grid.addWidget(plot, place // 2, place % 2)
        self.drawn: Drawn | None = None
        self.place = -1
        self._focus: QColor | None = None
        self._pressed: QPointF | None = None
        self._beside: list[Drawn] = []
        self._others: list[list[Curve]] = [[] for _ in self.plots]
        self._fits = [Curve() for _ in self.plots[:3]]
        self._points = [Marks(size=size) for size in (7, 7, 7, 5)]
        self._crosses = [Marks(symbol="x", size=8) for _ in self.plots[:3]]
        self._imaginary = Marks(symbol="t", size=6)
        self._zero = Line(upright=False)
        self._rings = [Marks(size=13) for _ in self.plots]
        self._lines = [Line(upright=True) for _ in (0, 1, 3)]
        self._place_items()
        self.beside_fit = FitDrawn(self.modulus, self.phase, self.plane)
        self.key = Key("Marks and lines of the spectrum")
        grid.addWidget(self.key, 2, 0, 1, 2)
        for plot in self.plots:
            plot.installEventFilter(self)
            plot.boxed.connect(lambda area, of=plot: self._box(of, area))

    def _place_items(self) -> None:
        self.residual.add(self._zero)
        for plot, curve, crosses in zip(self.plots, self._fits, self._crosses, strict=False):
            plot.add(curve, crosses)
        for plot, points, ring in zip(self.plots, self._points, self._rings, strict=True):
            plot.add(points, ring)
        self.residual.add(self._imaginary)
        for plot, line in zip((self.modulus, self.phase, self.residual), self._lines, strict=True):
            plot.add(line)

    # --- drawing ---------------------------------------------------------------------------

    def show_spectrum(
        self, drawn: Drawn | None, others: Sequence[tuple[Drawn, float]], tone: Colours
    ) -> None:
        """Draw a spectrum over others, each with its share of the exposure time (0 fresh, 1
        longest); the view follows when it is another spectrum."""
        before = None if self.drawn is None else self.drawn.spectrum
        same = drawn is not None and drawn.spectrum == before
        same = same and len(others) == len(self._beside)
        self.drawn, self._beside = drawn, [other for other, _ in others]
        self._focus = QColor(tone.verdigris)
        for plot in self.plots:
            plot.paint_in(tone.ground, tone.second, tone.line)
        self._draw_others(others, tone)
        if drawn is None:
            for item in (*self._fits, *self._points, *self._crosses, self._imaginary):
                item.show([], [])
            self.point_at(-1)
            self.key.show_entries([], tone.ink)
            return
        used, places = drawn.used, drawn.places()
        for item, (across, up) in zip(self._points, places, strict=True):
            item.show(across[used], up[used], QPen(QColor(tone.slate), 1.2))
        for item, (across, up) in zip(self._crosses, places, strict=False):
            item.show(across[~used], up[~used], QPen(QColor(tone.second), 2))
        self._draw_fit(drawn, tone)
        for line in self._lines:
            line.pen = QPen(QColor(tone.second), 1)
        for item in self._rings:
            item.pen = QPen(QColor(tone.verdigris), 2)
        self.point_at(self.place if same else -1)
        self._show_key(tone)
        if not same:
            self.whole_view()

    def show_beside_fit(
        self, band: FitBand | None, parts: Sequence[Part], frequency_hz: np.ndarray, tone: Colours
    ) -> None:
        """Draw the band and the parts of the fit that is shown."""
        self.beside_fit.show(band, parts, frequency_hz, tone)
        self._show_key(tone)

    def _show_key(self, tone: Colours) -> None:
        drawn = self.drawn
        if drawn is None:
            return
        entries = [Entry("circle", tone.slate, "measured")]
        if not drawn.used.all():
            entries.append(Entry("cross", tone.second, "left out"))
        if drawn.fit is not None:
            entries += [
                Entry("line", tone.verdigris, "fit"),
                *self.beside_fit.entries(tone),
                Entry("circle", tone.slate, "residual of Z′"),
                Entry("triangle", tone.amber, "residual of Z″"),
            ]
        if self._beside:
            entries.append(Entry("line", time_colour(0.5, tone.dark).name(), "other spectra"))
        self.key.show_entries(entries, tone.ink)

    def _draw_fit(self, drawn: Drawn, tone: Colours) -> None:
        x, off = np.log10(drawn.spectrum.frequency_hz), drawn.residual()
        pen = QPen(QColor(tone.verdigris), 1.6)
        self._zero.pen = QPen(QColor(tone.line), 1)
        if drawn.fit is None or off is None:
            for item in (*self._fits, self._imaginary, self._points[3]):
                item.show([], [])
            return
        model, used = drawn.fit.modelled_ohm, drawn.used
        for curve, (across, up) in zip(
            self._fits,
            (
                (x, np.log10(np.maximum(np.abs(model), 1e-30))),
                (x, np.degrees(np.angle(model))),
                (model.real, -model.imag),
            ),
            strict=True,
        ):
            curve.show(across, up, pen)
        self._imaginary.show(x[used], off.imag[used], QPen(QColor(tone.amber), 1))

    def _draw_others(self, others: Sequence[tuple[Drawn, float]], tone: Colours) -> None:
        for plot, curves in zip(self.plots[:3], self._others, strict=False):
            while len(curves) < len(others):
                curves.append(Curve(behind=True))
                plot.add(curves[-1])
            for curve in curves[len(others) :]:
                curve.show([], [])
        for number, (other, share) in enumerate(others):
            pen = QPen(QColor(time_colour(share, tone.dark)), 1.6)
            for curves, (across, up) in zip(self._others, other.places()[:3], strict=False):
                curves[number].show(across[other.used], up[other.used], pen)

    def whole_view(self) -> None:
        """Show every point; residuals evenly about zero."""
        if self.drawn is None:
            return
        drawn = [self.drawn, *self._beside]
        for number, plot in enumerate(self.plots[:3]):
            places = [d.places()[number] for d in drawn]
            across = np.concatenate([p[0] for p in places])
            up = np.concatenate([p[1] for p in places])
            plot.show_range(
                (float(across.min()), float(across.max())), (float(up.min()), float(up.max()))
            )
        off = self.drawn.residual()
        if off is not None and self.drawn.used.any():
            kept = off[self.drawn.used]
            most = max(float(np.abs(kept.real).max()), float(np.abs(kept.imag).max()), 0.05)
            self.residual.show_range(None, (-most, most), 0.08)

    # --- cursor, clicks, keys --------------------------------------------------------------

    def point_at(self, place: int) -> None:
        """Put the cursor on a point; -1 takes it away."""
        self.place = place
        drawn = self.drawn
        there = drawn is not None and 0 <= place < len(drawn.spectrum)
        for line in self._lines:
            line.is_shown = there
        for ring in self._rings:
            ring.is_shown = there
        for plot in self.plots:
            plot.update()
        if drawn is None or not there:
            self.pointed.emit("")
            return
        for ring, (across, up) in zip(self._rings, drawn.places(), strict=True):
            seen = bool(np.isfinite(up[place]))
            ring.show([across[place]] if seen else [], [up[place]] if seen else [])
        for line in self._lines:
            line.value = float(np.log10(drawn.spectrum.frequency_hz[place]))
        self.pointed.emit(self._words(drawn, place))

    def _words(self, drawn: Drawn, place: int) -> str:
        z, off = drawn.spectrum.impedance_ohm[place], drawn.residual()
        parts = [
            prefixed(float(drawn.spectrum.frequency_hz[place]), "Hz"),
            f"|Z| {prefixed(float(abs(z)), 'Ω')}",
            f"phase {float(np.degrees(np.angle(z))):.1f}°",
            f"Z′ {prefixed(float(z.real), 'Ω')}",
            f"−Z″ {prefixed(float(-z.imag), 'Ω')}",
        ]
        if not drawn.used[place]:
            parts.append("left out")
        elif off is not None:
            parts.append(f"residual {off[place].real:+.2f} % / {off[place].imag:+.2f} %")
        return "   ".join(parts).replace("-", "−")

    def _on_screen(self, plot: Canvas) -> np.ndarray:
        """Where the points stand in a plot, in its pixels, (N, 2)."""
        assert self.drawn is not None
        return plot.on_screen(*self.drawn.places()[self.plots.index(plot)])

    def nearest(self, plot: Canvas, where: QPointF) -> tuple[int, float]:
        """The point nearest to a place in a plot, and how many pixels off it is."""
        if self.drawn is None:
            return -1, np.inf
        off = np.hypot(*(self._on_screen(plot) - (where.x(), where.y())).T)
        if not np.isfinite(off).any():
            return -1, np.inf
        place = int(np.nanargmin(off))
        return place, float(off[place])

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        plot = next((p for p in self.plots if p is watched), None)
        if plot is None or self.drawn is None:
            return False
        kind = event.type()
        if kind == QEvent.Type.MouseMove and not event.buttons():  # type: ignore[attr-defined]
            where = event.position()  # type: ignore[attr-defined]
            if plot is self.plane:
                self.point_at(self.nearest(plot, where)[0])
            else:
                x = plot.at(where).x()
                logs = np.log10(self.drawn.spectrum.frequency_hz)
                self.point_at(int(np.abs(logs - x).argmin()))
        elif kind == QEvent.Type.MouseButtonPress:
            self.setFocus(Qt.FocusReason.MouseFocusReason)
            self._pressed = event.position()  # type: ignore[attr-defined]
        elif kind == QEvent.Type.MouseButtonDblClick:
            self.whole_view()
        elif kind == QEvent.Type.MouseButtonRelease:
            where, pressed = event.position(), self._pressed  # type: ignore[attr-defined]
            self._pressed = None
            still = pressed is not None and (where - pressed).manhattanLength() < 4
            place, off = self.nearest(plot, where)
            if still and off <= _REACH_PX and event.button() == Qt.MouseButton.LeftButton:  # type: ignore[attr-defined]
                self.toggled.emit([place])
        return False

    def _box(self, plot: Canvas, area: QRectF) -> None:
        if self.drawn is None:
            return
        across, up = self.drawn.places()[self.plots.index(plot)]
        inside = (area.left() <= across) & (across <= area.right())
        inside &= (area.top() <= up) & (up <= area.bottom())
        if inside.any():
            self.toggled.emit([int(place) for place in np.nonzero(inside)[0]])

    def paintEvent(self, event: QPaintEvent) -> None:
        if self.hasFocus() and self._focus is not None:
            painter = QPainter(self)
            painter.setPen(self._focus)
            painter.drawRect(self.rect().adjusted(0, 0, -1, -1))
            painter.end()

    def focusInEvent(self, event: QFocusEvent) -> None:
        super().focusInEvent(event)
        self.update()

    def focusOutEvent(self, event: QFocusEvent) -> None:
        super().focusOutEvent(event)
        self.update()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        last = -1 if self.drawn is None else len(self.drawn.spectrum) - 1
        # Spectra run from the highest frequency down, so that right is one point earlier.
        step = {Qt.Key.Key_Left: 1, Qt.Key.Key_Right: -1}.get(Qt.Key(event.key()), 0)
        if last < 0:
            super().keyPressEvent(event)
        elif step and not event.modifiers():
            here = self.place if self.place >= 0 else last + 1 if step < 0 else -1
            self.point_at(min(max(here + step, 0), last))
        elif event.key() in (Qt.Key.Key_Space, Qt.Key.Key_Delete) and self.place >= 0:
            self.toggled.emit([self.place])
        elif event.key() == Qt.Key.Key_Home:
            self.whole_view()
        else:
            super().keyPressEvent(event)
