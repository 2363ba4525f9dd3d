"""Places are built when they are first wanted."""

from __future__ import annotations

import pytest

pytest.importorskip("PySide6")

from coatgui.window.main_window import MainWindow
from coatgui.window.places.in_order import ORDER


def test_places_are_built_when_wanted_and_called_as_they_call_themselves(
    window: MainWindow,
) -> None:
    assert [place.noun for place in window.places.built] == ["Map"]
    window.go_to("Settings")
    assert [place.noun for place in window.places.built] == ["Map", "Settings"]
    assert [(p.noun, p.question, type(p).__name__) for p in window.places] == list(ORDER)
    assert len(window.places.built) == len(ORDER)
    assert window.places[-1] is window.open_place()
