"""The composer beside a reading: begins with a model, keeps and removes own ones by edits."""

from __future__ import annotations

import json

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QScrollArea, QVBoxLayout, QWidget

from coatgui.campaign import CampaignFileError, operations
from coatgui.circuits import ModelError
from coatgui.window.composer import Composer
from coatgui.window.desk import Desk
from coatgui.window.models import Draft, draft_of, models
from coatgui.window.palette import Colours


class Composing(QWidget):
    """`left` is sent when the person is done."""

    left = Signal()

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk = desk
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        self.composer = Composer(tone)
        self.composer.kept.connect(self._keep)
        self.composer.removed.connect(self._remove)
        self.composer.left.connect(self.left.emit)
        area = QScrollArea()  # in a low window the choices are scrolled to
        area.setWidget(self.composer)
        area.setWidgetResizable(True)
        area.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        column.addWidget(area)

    def _texts(self) -> dict[str, str]:
        """The campaign's own models by id, as they are stored."""
        campaign = self.desk.campaign
        texts = () if campaign is None else campaign.settings.own_models
        return {str(json.loads(text)["id"]): text for text in texts}

    def begin(self, picked: str, fitted: str, tone: Colours) -> None:
        """An own model that is picked is changed; else a new one begins like the fitted one."""
        draft = Draft()
        known = models(self.desk.campaign)
        if picked in self._texts():
            try:
                draft = draft_of(self._texts()[picked])
            except ModelError:
                draft = Draft(name=picked)
        elif (picked or fitted) in known:
            like = known[picked or fitted]
            draft = Draft("", like.layers, like.inductance)
        self.composer.compose(draft, tone)

    def _keep(self, text: str, before: str) -> None:
        model_id = str(json.loads(text)["id"])
        texts = self._texts()
        if model_id in texts and model_id != before:
            self.composer.say("There is a model of this name already: give it another name.")
            return
        texts[model_id] = text
        if self._edit(texts):
            self.left.emit()

    def _remove(self, model_id: str) -> None:
        texts = self._texts()
        texts.pop(model_id, None)
        if self._edit(texts):
            self.left.emit()

    def _edit(self, texts: dict[str, str]) -> bool:
        campaign = self.desk.campaign
        if campaign is None:
            return False
        own = tuple(texts.values())
        try:
            made = operations.edit_settings(campaign, own_models=own)
        except CampaignFileError as error:
            self.composer.say(str(error))
            return False
        if made.changes:
            self.desk.edit(operations.edit_settings, own_models=own)
        return True
