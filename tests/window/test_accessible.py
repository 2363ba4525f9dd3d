"""Names and descriptions for a screen reader, contrast, visible focus, and keys for everything."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import (
    QAbstractButton,
    QAbstractItemView,
    QApplication,
    QComboBox,
    QLineEdit,
    QProgressBar,
    QWidget,
)

from coatgui.window import palette
from coatgui.window.actions import ACTIONS
from coatgui.window.exposure_strip import ExposureStrip
from coatgui.window.facts import FactsView
from coatgui.window.legend import Legend
from coatgui.window.main_window import MainWindow
from coatgui.window.places.map_place import Cells
from coatgui.window.section import SectionView
from coatgui.window.spectrum_plots import SpectrumPlots

Wait = Callable[[Callable[[], bool]], None]
CONTROLS = (
    QAbstractButton,
    QAbstractItemView,
    QComboBox,
    QLineEdit,
    QProgressBar,
    ExposureStrip,
    FactsView,
    Legend,
    Cells,
    SectionView,
    SpectrumPlots,
)


@pytest.fixture
def full(window: MainWindow, wait: Wait, small: Path) -> MainWindow:
    window.open_path(small)
    wait(lambda: window.desk.job is None and window.desk.assessment is not None)
    return window


def controls(window: MainWindow) -> list[QWidget]:
    """Our controls; Qt's own parts of a control belong to it."""
    found = []
    for widget in window.findChildren(QWidget):
        above = widget.parent()
        inner = widget.objectName().startswith("qt_") or isinstance(above, (QComboBox, QLineEdit))
        while above is not None and not inner:
            inner = isinstance(above, QComboBox) or above.objectName().startswith("qt_")
            above = above.parent()
        if isinstance(widget, CONTROLS) and not inner:
            found.append(widget)
    return found


def is_header_corner(widget: QWidget) -> bool:
    return isinstance(widget, QAbstractButton) and isinstance(widget.parent(), QAbstractItemView)


def test_every_control_says_what_it_is_and_what_it_does(full: MainWindow) -> None:
    for place in range(len(full.places)):
        full.go(place)  # a place follows the campaign when it is seen
    silent = []
    for widget in controls(full):
        if is_header_corner(widget) or type(widget).__name__ == "QHeaderView":
            continue
        text = widget.text() if isinstance(widget, QAbstractButton) else ""
        if not (widget.accessibleName() or text):
            silent.append(f"no name: {widget!r}")
        elif not widget.accessibleDescription() and widget.isVisibleTo(widget.parentWidget()):
            silent.append(f"no description: {widget.accessibleName() or text} {widget!r}")
    assert not silent, "\n".join(silent)


def luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2)."""
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def test_the_measure_of_contrast_is_right() -> None:
    assert contrast("#000000", "#FFFFFF") == pytest.approx(21.0)
    assert contrast("#767676", "#FFFFFF") == pytest.approx(4.54, abs=0.01)


@pytest.mark.parametrize("dark", [False, True])
def test_text_has_contrast(dark: bool) -> None:
    tone = palette.colours(dark)
    for ink in (tone.ink, tone.second, tone.verdigris, tone.rust, tone.amber, tone.slate):
        for ground in (tone.ground, tone.panel):
            assert contrast(ink, ground) >= 4.5
    assert contrast(tone.ground, tone.verdigris) >= 4.5  # what is picked
    for share in range(21):
        ground_of, ink_of = palette.ramp(share / 20, dark)
        assert contrast(ground_of.name(), ink_of.name()) >= 4.5


@pytest.mark.parametrize("dark", [False, True])
def test_marks_have_contrast(dark: bool) -> None:
    tone = palette.colours(dark)
    assert contrast(tone.faint, tone.ground) >= 3.0
    for place in range(6):
        assert contrast(palette.formulation_look(place, dark)[0], tone.ground) >= 3.0
    steps = [contrast(palette.time_colour(s / 10, dark).name(), tone.ground) for s in range(11)]
    assert min(steps) >= 3.0
    assert steps == sorted(steps)  # the longer the exposure, the stronger the line
    looks = {palette.formulation_look(place, dark)[1] for place in range(6)}
    assert len(looks) == 6  # and a shape of its own for each


@pytest.mark.parametrize("place", range(8))
def test_what_has_the_keyboard_is_seen_to(full: MainWindow, place: int) -> None:
    full.go(place)
    full.activateWindow()
    assert QTest.qWaitForWindowActive(full)
    unseen = []
    for widget in controls(full):
        if not widget.isVisible() or not widget.isEnabled():
            continue
        if not widget.focusPolicy() & Qt.FocusPolicy.TabFocus:
            continue
        full.menuBar().setFocus()
        QApplication.processEvents()
        before = full.grab().toImage()
        widget.setFocus(Qt.FocusReason.TabFocusReason)
        QApplication.processEvents()
        if full.grab().toImage() == before:
            unseen.append(widget.accessibleName() or repr(widget))
    assert not unseen


@pytest.mark.parametrize("place", range(8))
def test_tab_comes_to_every_control(full: MainWindow, place: int) -> None:
    full.activateWindow()
    assert QTest.qWaitForWindowActive(full)
    full.go(place)
    wanted = {
        widget
        for widget in controls(full)
        if widget.isVisible()
        and widget.isEnabled()
        and widget.focusPolicy() & Qt.FocusPolicy.TabFocus
        and not is_header_corner(widget)
        # Of the places' buttons Tab comes to the open one; arrow keys go on from there.
        and not (isinstance(widget, QAbstractButton) and widget.group() and not widget.isChecked())
    }
    reached = set()
    full.project.filter.setFocus()
    for _ in range(4 * len(wanted) + 20):
        now = QApplication.focusWidget()
        assert now is not None
        reached.add(now)
        QTest.keyClick(now, Qt.Key.Key_Tab)
    assert {w.accessibleName() or repr(w) for w in wanted - reached} == set()


def test_every_place_and_menu_has_its_key(full: MainWindow) -> None:
    full.activateWindow()
    assert QTest.qWaitForWindowActive(full)
    for number, key in enumerate(range(Qt.Key.Key_1, Qt.Key.Key_9)):
        QTest.keyClick(full, Qt.Key(key), Qt.KeyboardModifier.ControlModifier)
        assert full.stack.currentIndex() == number
    shortcuts = [entry.shortcut for entry in ACTIONS if entry.shortcut]
    assert len(shortcuts) == len(set(shortcuts))
    letters = [
        action.text()[action.text().index("&") + 1].casefold()
        for action in full.menuBar().actions()
    ]
    assert len(letters) == len(set(letters))


def test_a_point_is_left_out_by_keys_alone(full: MainWindow, wait: Wait) -> None:
    full.go(1)
    plots = full.places[1].plots  # type: ignore[attr-defined]
    plots.setFocus()
    known = full.desk.reading_assessment()
    assert known is not None
    for _ in range(4):
        QTest.keyClick(plots, Qt.Key.Key_Left)
    assert "Hz" in full.places[1].read_out.text()  # type: ignore[attr-defined]
    QTest.keyClick(plots, Qt.Key.Key_Space)
    QApplication.processEvents()
    reading = full.desk.reading()
    assert reading is not None
    assert [point for point, _ in reading.left_out] == [3]
    wait(lambda: full.desk.job is None)
    QTest.keyClick(plots, Qt.Key.Key_Space)
    QApplication.processEvents()
    reading = full.desk.reading()
    assert reading is not None
    assert not reading.left_out
