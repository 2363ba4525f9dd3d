"""The window's colours, light and dark, from `resources/colours.toml`."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from typing import Any

from PySide6.QtGui import QColor, QGuiApplication, QPalette
from PySide6.QtWidgets import QApplication

from coatgui.shipped import resource


@dataclass(frozen=True)
class Colours:
    ground: str
    panel: str
    line: str
    ink: str
    second: str
    verdigris: str
    rust: str
    amber: str
    slate: str
    faint: str
    dark: bool


@cache
def _data() -> dict[str, Any]:
    return tomllib.loads(resource("colours.toml").read_text(encoding="utf-8"))


@cache
def colours(dark: bool) -> Colours:
    return Colours(**_data()["dark" if dark else "light"], dark=dark)


def formulation_look(place: int, dark: bool) -> tuple[str, str]:
    """Colour and marker shape of the formulation at a place in the campaign."""
    looks = _data()["formulations"]
    hues = looks["dark" if dark else "light"]
    return hues[place % len(hues)], looks["shapes"][place % len(looks["shapes"])]


def system_is_dark() -> bool:
    """Whether the desktop asks for dark windows."""
    from PySide6.QtCore import Qt

    hints = QGuiApplication.styleHints()
    return bool(hints.colorScheme() == Qt.ColorScheme.Dark)


def ramp(share: float, dark: bool) -> tuple[QColor, QColor]:
    """Ground and ink of a cell for a share from 0 (poor barrier, pale) to 1 (good, deep). One hue;
    lightness falls evenly. On dark ground the palest is a middle tone, for a white cell would
    glare."""
    share = min(max(share, 0.0), 1.0)
    if dark:
        ground = QColor.fromHslF(0.56, 0.28, 0.60 - 0.39 * share)
    else:
        ground = QColor.fromHslF(0.56, 0.30, 0.93 - 0.65 * share)
    # Black and white stand at equal contrast where the relative luminance is 0.179.
    linear = [
        c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4
        for c in (ground.redF(), ground.greenF(), ground.blueF())
    ]
    luminance = 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
    return ground, QColor("#000000" if luminance > 0.179 else "#FFFFFF")


def time_colour(share: float, dark: bool) -> QColor:
    """Line colour for a share of the exposure time, 0 fresh to 1 longest: one hue, evenly stepped
    from what just shows on the ground to what shows strongly."""
    share = min(max(share, 0.0), 1.0)
    lightness = 0.50 + 0.36 * share if dark else 0.56 - 0.38 * share
    return QColor.fromHslF(0.585, 0.34, lightness)


def apply(application: QApplication, tone: Colours) -> None:
    """Give the whole program these colours and the quiet shapes that go with them."""
    palette = QPalette()
    role = QPalette.ColorRole
    for which, colour in (
        (role.Window, tone.ground),
        (role.Base, tone.ground),
        (role.AlternateBase, tone.panel),
        (role.Button, tone.panel),
        (role.ToolTipBase, tone.panel),
        (role.Text, tone.ink),
        (role.WindowText, tone.ink),
        (role.ButtonText, tone.ink),
        (role.ToolTipText, tone.ink),
        (role.PlaceholderText, tone.second),
        (role.Highlight, tone.verdigris),
        (role.HighlightedText, tone.ground),
        (role.Link, tone.verdigris),
        (role.Mid, tone.line),
    ):
        palette.setColor(which, QColor(colour))
    disabled = QPalette.ColorGroup.Disabled
    for which in (role.Text, role.WindowText, role.ButtonText):
        palette.setColor(disabled, which, QColor(tone.second))
    arrow = resource("icons/opens_down.svg").as_posix()
    application.setStyle("Fusion")
    application.setPalette(palette)
    application.setStyleSheet(
        f"""
        QWidget {{ font-size: 13px; }}
        QTreeView, QTableWidget, QListWidget {{ border: 1px solid transparent;
            background: {tone.ground};
            alternate-background-color: {tone.panel}; gridline-color: {tone.line}; }}
        QHeaderView::section {{ background: {tone.panel}; color: {tone.second}; border: 0;
            border-bottom: 1px solid {tone.line}; padding: 4px 8px; font-size: 11px; }}
        QMenuBar, QMenu, QStatusBar {{ background: {tone.panel}; color: {tone.ink}; }}
        QMenu::item:selected, QMenuBar::item:selected {{ background: {tone.verdigris};
            color: {tone.ground}; }}
        QSplitter::handle {{ background: {tone.line}; }}
        QMenu {{ border: 1px solid {tone.line}; padding: 4px 0; }}
        QMenu::item {{ padding: 5px 24px 5px 16px; }}
        QMenu::item:disabled {{ color: {tone.faint}; }}
        QMenu::separator {{ height: 1px; background: {tone.line}; margin: 4px 12px; }}
        QComboBox::drop-down {{ border: 0; width: 22px; }}
        QComboBox::down-arrow {{ image: url("{arrow}"); width: 14px; height: 14px; }}
        QComboBox QAbstractItemView {{ background: {tone.ground}; color: {tone.ink};
            border: 1px solid {tone.line}; selection-background-color: {tone.verdigris};
            selection-color: {tone.ground}; outline: 0; }}
        QToolTip {{ background: {tone.panel}; color: {tone.ink}; border: 1px solid {tone.line};
            padding: 4px; }}
        QProgressBar {{ background: {tone.ground}; border: 1px solid {tone.line};
            border-radius: 3px; height: 10px; }}
        QProgressBar::chunk {{ background: {tone.verdigris}; }}
        QScrollBar:vertical {{ background: transparent; width: 10px; margin: 0; }}
        QScrollBar:horizontal {{ background: transparent; height: 10px; margin: 0; }}
        QScrollBar::handle {{ background: {tone.faint}; border-radius: 3px; margin: 2px;
            min-height: 24px; min-width: 24px; }}
        QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
        QScrollBar::add-page, QScrollBar::sub-page {{ background: transparent; }}
        QLineEdit, QComboBox {{ background: {tone.ground}; border: 1px solid {tone.line};
            border-radius: 3px; padding: 3px 6px; }}
        QPushButton {{ background: {tone.panel}; border: 1px solid {tone.line};
            border-radius: 3px; padding: 6px 14px; }}
        QPushButton:focus, QLineEdit:focus, QComboBox:focus {{
            border: 1px solid {tone.verdigris}; }}
        QPushButton:checked {{ border: 1px solid {tone.verdigris}; color: {tone.verdigris}; }}
        QPushButton#place {{ background: transparent; border: 0; border-radius: 0;
            border-bottom: 2px solid transparent; padding: 8px 16px; color: {tone.second};
            font-size: 14px; }}
        QPushButton#place:checked {{ color: {tone.ink};
            border-bottom: 2px solid {tone.verdigris}; }}
        QPushButton#place:focus {{ color: {tone.verdigris}; }}
        QLabel#headline {{ font-size: 20px; color: {tone.ink}; }}
        QLabel#question {{ font-size: 16px; color: {tone.ink}; }}
        QLabel#empty {{ font-size: 16px; color: {tone.second}; }}
        QLabel#small {{ font-size: 11px; color: {tone.second}; }}
        QLabel#fact_title {{ font-size: 16px; }}
        QLabel#wrong {{ color: {tone.rust}; }}
        QLabel#fact_name {{ font-size: 11px; color: {tone.second}; }}
        QLabel#fact_note, QLabel#fact_caution {{ font-size: 11px; color: {tone.second}; }}
        QPushButton#first {{ background: {tone.verdigris}; color: {tone.ground};
            border-color: {tone.verdigris}; }}
        QPushButton#first:focus {{ border: 2px solid {tone.ink}; padding: 5px 13px; }}
        QPushButton#link {{ background: transparent; border: 1px solid transparent;
            color: {tone.verdigris}; text-align: left; padding: 3px 6px; }}
        QPushButton#link:focus, QPushButton#link:hover {{ border-color: {tone.verdigris}; }}
        QPushButton:hover {{ border-color: {tone.second}; }}
        QPushButton:disabled {{ color: {tone.faint}; }}
        QCheckBox::indicator {{ width: 12px; height: 12px; border: 1px solid {tone.second};
            border-radius: 2px; background: {tone.ground}; }}
        QCheckBox::indicator:checked {{ border: 4px solid {tone.verdigris}; width: 6px;
            height: 6px; background: {tone.ink}; }}
        QCheckBox:focus {{ color: {tone.verdigris}; }}
        QCheckBox:disabled {{ color: {tone.faint}; }}
        QScrollArea {{ border: 1px solid transparent; }}
        QScrollArea:focus {{ border: 1px solid {tone.verdigris}; }}
        QTreeView:focus, QListWidget:focus, QTableWidget:focus {{
            border: 1px solid {tone.verdigris}; }}
        QFrame#trouble {{ background: {tone.panel}; border: 0;
            border-bottom: 1px solid {tone.line}; }}
        QFrame#trouble QLabel {{ color: {tone.rust}; }}
        QFrame#side {{ background: {tone.panel}; }}
        """
    )
