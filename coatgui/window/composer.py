"""Composing a coating model of one's own, layer by layer, beside the section it makes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from PySide6.QtCore import Signal
from PySide6.QtWidgets import (
    QCheckBox,
    QComboBox,
    QGridLayout,
    QHBoxLayout,
    QLineEdit,
    QPushButton,
    QVBoxLayout,
    QWidget,
)

from coatgui.circuits import CoatingModel, Layer, ModelError, ParameterSpec, build_model
from coatgui.window.bound_parameters import BoundParameters
from coatgui.window.models import Draft
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_label
from coatgui.window.section import SectionView, section_of_model

_ROLES = {
    "Film": "film", "Outer film": "film_1", "Inner film": "film_2",
    "Porous layer": "porous_layer", "Interface": "interface",
}  # fmt: skip
_DIELECTRICS = {
    "capacitor": "capacitor", "constant-phase": "constant_phase", "graded film": "graded_film",
}  # fmt: skip
# The ionic side with its diffusion, as one choice.
_IONIC = {
    "none: blocks": ("none", "none"),
    "resistor": ("resistor", "none"),
    "resistor, diffusion without end": ("resistor", "semi_infinite"),
    "resistor, diffusion to an open end": ("resistor", "open"),
    "resistor, diffusion to a closed end": ("resistor", "closed"),
}
_NEXT = {"inside the pores": "behind_ionic", "behind the whole layer": "behind_layer"}


class Composer(QWidget):
    """`kept` carries the text of a sound model and the id it had before ("" for a new one),
    `removed` an id, `left` that the person is done."""

    kept = Signal(str, str)
    removed = Signal(str)
    left = Signal()

    def __init__(self, tone: Colours) -> None:
        super().__init__()
        self.tone = tone
        self.draft = Draft()
        self.layer = 1
        self._specs: tuple[ParameterSpec, ...] = ()
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(6)
        self.name = QLineEdit()
        self.name.setPlaceholderText("name of the model")
        self.name.setAccessibleName("Name of the model")
        self.name.setAccessibleDescription("As it shall stand in the list of models")
        self.name.textEdited.connect(lambda text: self._put(replace(self.draft, name=text)))
        column.addWidget(self.name)
        self.view = SectionView(tone)
        self.view.setMinimumHeight(150)
        self.view.setToolTip("Click a layer to change it")
        self.view.clicked.connect(self.pick)
        column.addWidget(self.view, 1)
        row = QHBoxLayout()
        self.layers = _chooser("Layer in hand", "The layer that the choices below belong to", ())
        self.layers.activated.connect(lambda index: self.pick(index + 1))
        add, remove = QPushButton("Add a layer"), QPushButton("Take out")
        add.setAccessibleDescription("A layer under the one in hand")
        remove.setAccessibleDescription("Take out the layer in hand")
        add.clicked.connect(self.add_layer)
        remove.clicked.connect(self.remove_layer)
        row.addWidget(self.layers, 1)
        row.addWidget(add)
        row.addWidget(remove)
        column.addLayout(row)
        grid = QGridLayout()
        grid.setVerticalSpacing(4)
        self.choices: dict[str, QComboBox] = {}
        fields: tuple[tuple[str, str, list[str]], ...] = (
            ("role", "is", list(_ROLES)),
            ("dielectric", "dielectric side", list(_DIELECTRICS)),
            ("ionic", "ionic side", list(_IONIC)),
            ("next_layer", "next layer", list(_NEXT)),
        )
        for place, (field, words, options) in enumerate(fields):
            label = plain_label("small")
            label.setText(words)
            chooser = _chooser(f"The layer: {words}", "Changes the layer in hand", options)
            chooser.activated.connect(self._chosen)
            self.choices[field] = chooser
            grid.addWidget(label, place, 0)
            grid.addWidget(chooser, place, 1)
        grid.setColumnStretch(1, 1)
        column.addLayout(grid)
        self.inductance = QCheckBox("The leads have an inductance")
        self.inductance.setAccessibleDescription("L in series with everything")
        self.inductance.clicked.connect(
            lambda on: self._put(replace(self.draft, inductance=bool(on)))
        )
        column.addWidget(self.inductance)
        self.bound = BoundParameters()
        self.fixed = self.bound.table
        self.bound.held.connect(lambda fixed: self._put(replace(self.draft, fixed=fixed)))
        self.bound.tied.connect(lambda tied: self._put(replace(self.draft, tied=tied)))
        self.bound.wrong.connect(self.say)
        column.addWidget(self.fixed, 1)
        self.verdict = plain_label()
        column.addWidget(self.verdict)
        buttons = QHBoxLayout()
        self.keep = QPushButton("Keep the model")
        self.keep.setObjectName("first")
        self.keep.setAccessibleDescription("Store it in the campaign's settings")
        self.keep.clicked.connect(lambda: self.kept.emit(self.draft.text(), self.draft.model_id))
        self.drop = QPushButton("Remove")
        self.drop.setAccessibleDescription("Take this model out of the campaign")
        self.drop.clicked.connect(lambda: self.removed.emit(self.draft.model_id))
        leave = QPushButton("Leave")
        leave.setAccessibleDescription("Back to the reading, without keeping what was changed")
        leave.clicked.connect(self.left.emit)
        for button in (self.keep, self.drop, leave):
            buttons.addWidget(button)
        buttons.addStretch(1)
        column.addLayout(buttons)

    def compose(self, draft: Draft, tone: Colours) -> None:
        """Begin with a draft."""
        self.tone, self.layer = tone, 1
        self.name.setText(draft.name)
        self._put(draft)

    def paint_in(self, tone: Colours) -> None:
        self.tone = tone
        self._put(self.draft)

    def say(self, sentence: str) -> None:
        """Say what is wrong in place of the verdict; the model cannot be kept so."""
        self.verdict.setObjectName("wrong")
        self.verdict.setText(f"■  {sentence}")
        self._restyle()
        self.keep.setEnabled(False)

    # --- layers ----------------------------------------------------------------------------

    def pick(self, layer: int) -> None:
        """Take a layer in hand, 1 the outermost."""
        self.layer = min(max(layer, 1), len(self.draft.layers))
        self._put(self.draft)

    def add_layer(self) -> None:
        layers, used = list(self.draft.layers), {layer.role for layer in self.draft.layers}
        free = [role for role in ("interface", "film", "porous_layer", "film_1", "film_2")
                if role not in used]  # fmt: skip
        if not free:
            self.say("There are five layers already; take one out first.")
            return
        above = layers[self.layer - 1]
        if above.ionic == "none" and above.next_layer == "behind_ionic":
            # Something must lead inwards, else the new layer could not be reached.
            layers[self.layer - 1] = replace(above, ionic="resistor")
        layers.insert(self.layer, Layer(free[0]))
        self.layer += 1
        self._put(replace(self.draft, layers=tuple(layers)))

    def remove_layer(self) -> None:
        layers = self.draft.layers[: self.layer - 1] + self.draft.layers[self.layer :]
        self.layer = max(min(self.layer, len(layers)), 1)
        self._put(replace(self.draft, layers=layers or (Layer("film"),)))

    def _chosen(self) -> None:
        ionic, diffusion = _IONIC[self.choices["ionic"].currentText()]
        changed = Layer(
            _ROLES[self.choices["role"].currentText()],
            _DIELECTRICS[self.choices["dielectric"].currentText()],
            ionic,
            diffusion,
            _NEXT[self.choices["next_layer"].currentText()],
        )
        layers = list(self.draft.layers)
        layers[self.layer - 1] = changed
        self._put(replace(self.draft, layers=tuple(layers)))

    # --- what it makes ---------------------------------------------------------------------

    def _put(self, draft: Draft) -> None:
        """Take on a draft, show it and judge it."""
        plain = _without_held(draft)
        if plain is not None:
            self._specs = plain.all_parameters
            kinds = {spec.symbol: spec.kind for spec in self._specs}
            draft = replace(
                draft,
                fixed=tuple(f for f in draft.fixed if f[0] in kinds),
                tied=tuple(
                    (s, t) for s, t in draft.tied if s in kinds and kinds[s] is kinds.get(t)
                ),
            )
        self.draft = draft
        self._show(plain)
        try:
            model = draft.model()
        except ModelError as error:
            self.say(str(error))
            return
        self.verdict.setObjectName("")
        free, held, tied = len(model.parameters), len(draft.fixed), len(draft.tied)
        text = f"A circuit with {free} parameters to fit"
        text += f", {held} held" if held else ""
        text += f", {tied} tied" if tied else ""
        self.verdict.setText(f"{text}; with perfect data each could be told from the others.")
        self._restyle()
        self.keep.setEnabled(True)
        self.view.show_section(section_of_model(model, self.layer), self.tone)

    def _show(self, plain: CoatingModel | None) -> None:
        if plain is not None:
            self.view.show_section(section_of_model(plain, self.layer), self.tone)
        layer = self.draft.layers[self.layer - 1]
        self.layers.clear()
        for place, each in enumerate(self.draft.layers, start=1):
            self.layers.addItem(f"{place}  {_words(_ROLES, each.role)}")
        self.layers.setCurrentIndex(self.layer - 1)
        self.choices["role"].setCurrentText(_words(_ROLES, layer.role))
        self.choices["dielectric"].setCurrentText(_words(_DIELECTRICS, layer.dielectric))
        self.choices["ionic"].setCurrentText(_words(_IONIC, (layer.ionic, layer.diffusion)))
        self.choices["next_layer"].setCurrentText(_words(_NEXT, layer.next_layer))
        self.choices["next_layer"].setEnabled(self.layer < len(self.draft.layers))
        self.inductance.setChecked(self.draft.inductance)
        self.drop.setVisible(bool(self.draft.model_id))
        self.bound.show_parameters(self._specs, self.draft.fixed, self.draft.tied)

    def _restyle(self) -> None:
        self.verdict.style().unpolish(self.verdict)
        self.verdict.style().polish(self.verdict)


def _without_held(draft: Draft) -> CoatingModel | None:
    """The draft's circuit with every parameter free, or None where it makes none."""
    try:
        return build_model("draft", draft.name, draft.layers, inductance=draft.inductance)
    except ModelError:
        return None


def _words(options: dict[str, str] | dict[str, tuple[str, str]], value: object) -> str:
    return next((words for words, each in options.items() if each == value), next(iter(options)))


def _chooser(name: str, description: str, items: Sequence[str]) -> QComboBox:
    chooser = QComboBox()
    chooser.setAccessibleName(name)
    chooser.setAccessibleDescription(description)
    chooser.addItems(list(items))
    return chooser
