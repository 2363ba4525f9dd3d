"""A campaign as people keep it: formulations, panels, readings, settings."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from coatgui.records.measured import Refusal, Source, Spectrum
from coatgui.records.presets import Electrolyte, Regime
from coatgui.records.questions import Limit, ProjectionWanted, Question


@dataclass(frozen=True, slots=True)
class Formulation:
    formulation_id: str
    name: str
    remark: str = ""


@dataclass(frozen=True, slots=True)
class Panel:
    panel_id: str
    name: str
    formulation_id: str
    area_cm2: float | None = None
    thickness_um: float | None = None
    substrate: str = ""
    electrolyte: str = ""
    temperature_c: float | None = None
    regime: str = ""
    remark: str = ""
    notes: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Reading:
    """One spectrum of one panel at one exposure time, with what a person decided about it.

    `left_out` and `kept_in` are places of points: those a person takes out, and those a person
    keeps although the checks suggest leaving them out. `pinned_model` names a coating model that a
    person insists on. `overruled_because` is a person's reason for using a rejected reading.
    `temperature_span_c` and `potential_span_mv` are the lowest and the highest within the sweep,
    where the file gives them point by point.
    """

    reading_id: str
    panel_id: str
    exposure_h: float
    spectrum: Spectrum
    source: Source
    temperature_c: float | None = None
    amplitude_mv: float | None = None
    potential_mv: float | None = None
    remark: str = ""
    left_out: tuple[tuple[int, str], ...] = ()
    kept_in: tuple[int, ...] = ()
    pinned_model: str = ""
    overruled_because: str = ""
    temperature_span_c: tuple[float, float] | None = None
    potential_span_mv: tuple[float, float] | None = None


@dataclass(frozen=True, slots=True)
class Criterion:
    """A limit that panels are held against: |Z|·A at a frequency falling below a value."""

    name: str
    frequency_hz: float
    ohm_cm2: float
    source: str


@dataclass(frozen=True, slots=True)
class Settings:
    """What a person can set for a campaign. `thresholds` override single entries of
    `resources/checks.toml`, by name. `input_resistance_ohm` and `input_capacitance_f` are what the
    instrument's maker states for its input; `take_leads_away` corrects every spectrum for the open
    leads or that input. `own_models` are coating models as JSON texts, in the form of
    `resources/models.toml`. `limits` on any quantity stand beside `criteria`; `comparisons` and
    `projections` are what is asked beyond the usual. `electrolytes` and `regimes` stand beside the
    program's own or, under the same id, in place of them. `uptake_from_high_frequency`: the water
    uptake rests on the capacitance measured at the high frequency, whatever the circuits say."""

    temperature_c: float = 25.0
    modulus_frequencies_hz: tuple[float, ...] = (0.1, 0.01)
    capacitance_frequency_hz: float = 10_000.0
    mains_hz: float = 50.0
    criteria: tuple[Criterion, ...] = ()
    thresholds: tuple[tuple[str, float], ...] = ()
    input_resistance_ohm: float | None = None
    input_capacitance_f: float | None = None
    take_leads_away: bool = False
    own_models: tuple[str, ...] = ()
    limits: tuple[Limit, ...] = ()
    comparisons: tuple[Question, ...] = ()
    projections: tuple[ProjectionWanted, ...] = ()
    electrolytes: tuple[Electrolyte, ...] = ()
    regimes: tuple[Regime, ...] = ()
    uptake_from_high_frequency: bool = False


@dataclass(frozen=True, slots=True)
class Identification:
    """What a summary names besides the campaign: for whom, by whom, after which standards."""

    laboratory: str = ""
    customer: str = ""
    order: str = ""
    author: str = ""
    reviewer: str = ""
    standards: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class VisualRating:
    """What a person saw on a panel, in the words of a named scale and edition. `scale` is a scale
    of `resources/ratings.toml`, `value` as that scale writes it, such as "2(S3)" or "4B"."""

    panel_id: str
    exposure_h: float
    scale: str
    value: str
    edition: str = ""
    rater: str = ""
    remark: str = ""


@dataclass(frozen=True, slots=True)
class Rating:
    """A visual rating as the campaign keeps it."""

    rating_id: str
    seen: VisualRating


@dataclass(frozen=True, slots=True)
class Photograph:
    """A photograph of a panel. Its bytes lie in the campaign file under `sha256`; `media_type` is
    what they are by their content, `file` the name they came under, without a folder. `exposure_h`
    None: no inspection is named."""

    photograph_id: str
    panel_id: str
    sha256: str
    media_type: str
    exposure_h: float | None = None
    caption: str = ""
    file: str = ""


class _ById:
    """Holds an index of readings, which is no part of what a campaign says."""

    __slots__ = ("_index",)
    _index: dict[str, Reading]


@dataclass(frozen=True, slots=True)
class Campaign(_ById):
    """A campaign whole. Ids are random and stable; names may change."""

    campaign_id: str
    title: str
    settings: Settings = Settings()
    formulations: tuple[Formulation, ...] = ()
    panels: tuple[Panel, ...] = ()
    readings: tuple[Reading, ...] = ()
    open_lead: Spectrum | None = None
    open_lead_source: Source | None = None
    refused: tuple[Refusal, ...] = ()
    remark: str = ""
    ratings: tuple[Rating, ...] = ()
    photographs: tuple[Photograph, ...] = ()
    identification: Identification = Identification()

    def reading(self, reading_id: str) -> Reading | None:
        """The reading of an id, None where there is none. The first question makes an index."""
        try:
            index = self._index
        except AttributeError:
            index = {reading.reading_id: reading for reading in self.readings}
            object.__setattr__(self, "_index", index)
        return index.get(reading_id)

    def take_index(self, before: Campaign, replaced: Iterable[Reading]) -> None:
        """Carry on the index of a campaign that differs in nothing but these readings, which took
        the places of others with their ids: an edit of a large campaign then needs no new one."""
        try:
            index = before._index
            object.__delattr__(before, "_index")
        except AttributeError:
            return
        index.update((reading.reading_id, reading) for reading in replaced)
        object.__setattr__(self, "_index", index)
