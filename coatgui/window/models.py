"""The coating models that can be picked in a campaign: the catalogue's and a person's own."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from functools import lru_cache
from types import MappingProxyType

from coatgui.assessment.own_models import own_model
from coatgui.circuits import CoatingModel, Layer, ModelError, catalogue
from coatgui.records import Campaign


@lru_cache(maxsize=32)
def _own(texts: tuple[str, ...]) -> Mapping[str, CoatingModel]:
    found = {}
    for text in texts:
        try:
            model = own_model(text)
        except ModelError:
            continue  # the assessment says what is wrong with it
        found[model.model_id] = model
    return MappingProxyType(found)


def own_models(campaign: Campaign | None) -> Mapping[str, CoatingModel]:
    """The campaign's own models that can be used, by id."""
    return _own(() if campaign is None else campaign.settings.own_models)


def models(campaign: Campaign | None) -> Mapping[str, CoatingModel]:
    """Every model by id, the catalogue's first."""
    return {**catalogue(), **own_models(campaign)}


@dataclass(frozen=True)
class Draft:
    """A model that is being composed. `model_id` is empty for a new one; `fixed` holds parameters
    at values per specimen, by symbol, and `tied` those that have the value of another."""

    name: str = ""
    layers: tuple[Layer, ...] = (Layer("film"),)
    inductance: bool = False
    fixed: tuple[tuple[str, float], ...] = ()
    model_id: str = ""
    tied: tuple[tuple[str, str], ...] = ()

    def groups(self) -> list[list[str]]:
        """The parameters that share one value, each group begun by the one that is fitted."""
        leaders = list(dict.fromkeys(leader for _, leader in self.tied))
        return [[one, *(s for s, leader in self.tied if leader == one)] for one in leaders]

    def text(self) -> str:
        """The JSON text that is stored in the settings."""
        return json.dumps(
            {
                "id": self.model_id or _id_of(self.name),
                "name": self.name.strip(),
                "layer": [asdict(layer) for layer in self.layers],
                "inductance": self.inductance,
                "fixed": dict(self.fixed),
                "tied": self.groups(),
            },
            ensure_ascii=False,
        )

    def model(self) -> CoatingModel:
        """The model as it stands. Raises ModelError, in a sentence, where it is none."""
        if not self.name.strip():
            raise ModelError("Give the model a name to keep it by.")
        return own_model(self.text())


def draft_of(text: str) -> Draft:
    """The draft of a stored model that can be used. Raises ModelError where it cannot."""
    model = own_model(text)
    data = json.loads(text)
    fixed = tuple((str(k), float(v)) for k, v in (data.get("fixed") or {}).items())
    tied = tuple((str(s), str(group[0])) for group in data.get("tied") or () for s in group[1:])
    return Draft(model.name, model.layers, model.inductance, fixed, model.model_id, tied)


def _id_of(name: str) -> str:
    letters = "".join(c if c.isalnum() else " " for c in name.casefold())
    return "_".join(letters.split()) or "own"
