"""The catalogue of coating models, read from `resources/models.toml`."""

from __future__ import annotations

import tomllib
from functools import cache
from types import MappingProxyType

from coatgui.circuits.layers import CoatingModel, ModelError, model_from_data
from coatgui.shipped import resource


@cache
def catalogue() -> MappingProxyType[str, CoatingModel]:
    """All shipped models by id, from the closed film to the bare metal."""
    data = tomllib.loads(resource("models.toml").read_text(encoding="utf-8"))
    models = {model.model_id: model for model in map(model_from_data, data["model"])}
    for model in models.values():
        if model.twin and model.twin not in models:
            raise ModelError(f"Coating model '{model.model_id}' names an unknown twin.")
    return MappingProxyType(models)
