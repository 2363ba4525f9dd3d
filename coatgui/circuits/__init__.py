"""Elements, their composition, and the catalogue of coating models: values and derivatives."""

from coatgui.circuits.catalogue import catalogue
from coatgui.circuits.elements import Grid, Kind, Scale
from coatgui.circuits.layers import (
    CoatingModel,
    Layer,
    ModelError,
    ParameterSpec,
    build_model,
    model_from_data,
)
from coatgui.circuits.network import Evaluation
from coatgui.circuits.told_apart import tied_by_the_circuit

__all__ = [
    "CoatingModel",
    "Evaluation",
    "Grid",
    "Kind",
    "Layer",
    "ModelError",
    "ParameterSpec",
    "Scale",
    "build_model",
    "catalogue",
    "model_from_data",
    "tied_by_the_circuit",
]
