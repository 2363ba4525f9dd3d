"""Settings: what a person sets for a campaign, every change an edit that can be taken back."""

from __future__ import annotations

from typing import Any

from PySide6.QtWidgets import QCheckBox, QHBoxLayout, QScrollArea, QVBoxLayout, QWidget

from coatgui.campaign import CampaignFileError, OperationRefused, operations
from coatgui.records import Settings
from coatgui.window.criteria_table import CriteriaTable, LimitsTable
from coatgui.window.desk import Desk
from coatgui.window.field import Field
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label
from coatgui.window.thresholds_table import ThresholdsTable
from coatgui.window.typed import typed, typed_list, written


class SettingsPlace(Place):
    noun, question = "Settings", "By what is this campaign judged?"
    note = "kramers_kronig"
    has_strip = False

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        about = plain_label("small")
        about.setText(
            "Numbers can be typed with their unit, such as 4,6 nF or 2 TΩ. Every change is judged "
            "at once and can be undone."
        )
        self.column.addWidget(about)
        halves = QHBoxLayout()
        halves.setSpacing(16)
        self.column.addLayout(halves, 1)
        page = QWidget()
        left = QVBoxLayout(page)
        left.setContentsMargins(0, 0, 8, 0)
        left.setSpacing(8)
        self.fields = {
            "temperature_c": Field(
                "Temperature", "where a reading has none of its own",
                lambda text: self._set(temperature_c=typed(text, "°C")),
            ),
            "modulus_frequencies_hz": Field(
                "Frequencies for |Z|", "the first is watched and compared",
                lambda text: self._set(modulus_frequencies_hz=typed_list(text, "Hz")),
            ),
            "capacitance_frequency_hz": Field(
                "Frequency for capacitance", "the water uptake rests on it",
                lambda text: self._set(capacitance_frequency_hz=typed(text, "Hz")),
            ),
            "mains_hz": Field(
                "Mains", "readings near it and its harmonics are watched",
                lambda text: self._set(mains_hz=typed(text, "Hz")),
            ),
            "input_resistance_ohm": Field(
                "Input resistance", "as the instrument's maker states it; empty: not known",
                lambda text: self._set(
                    input_resistance_ohm=typed(text, "Ω") if text else None
                ),
            ),
            "input_capacitance_f": Field(
                "Input capacitance", "as the maker states it; empty: not known",
                lambda text: self._set(
                    input_capacitance_f=typed(text, "F") if text else None
                ),
            ),
        }  # fmt: skip
        self._title(left, "Conditions")
        for name in ("temperature_c", "modulus_frequencies_hz", "capacitance_frequency_hz",
                     "mains_hz"):  # fmt: skip
            left.addWidget(self.fields[name])
        self._title(left, "Instrument and leads")
        for name in ("input_resistance_ohm", "input_capacitance_f"):
            left.addWidget(self.fields[name])
        self.leads = QCheckBox("Take the leads away from every spectrum")
        self.leads.setAccessibleDescription(
            "Correct by the open-lead run, or by the stated input where there is none"
        )
        self.leads.clicked.connect(lambda on: self._try(take_leads_away=bool(on)))
        left.addWidget(self.leads)
        self.leads_note = plain_label("small")
        left.addWidget(self.leads_note)
        self._title(left, "Criteria")
        self.criteria = CriteriaTable(lambda rows: self._set(criteria=rows))
        left.addWidget(self.criteria)
        self._title(left, "Limits on other quantities")
        self.limits = LimitsTable(lambda rows: self._set(limits=rows))
        left.addWidget(self.limits)
        left.addStretch(1)
        area = QScrollArea()
        area.setWidget(page)
        area.setWidgetResizable(True)
        area.setAccessibleName("Conditions, instrument, criteria, limits")
        area.setAccessibleDescription("Up and down scroll")
        halves.addWidget(area, 1)
        right = QVBoxLayout()
        right.setSpacing(8)
        self._title(right, "Thresholds of the checks")
        self.thresholds = ThresholdsTable(lambda pairs: self._set(thresholds=pairs))
        right.addWidget(self.thresholds, 1)
        halves.addLayout(right, 1)

    def _title(self, column: QVBoxLayout, text: str) -> None:
        label = plain_label("fact_title")
        label.setText(text)
        column.addWidget(label)

    def show_campaign(self) -> None:
        campaign = self.desk.campaign
        settings = Settings() if campaign is None else campaign.settings
        hertz = settings.modulus_frequencies_hz
        for name, text in (
            ("temperature_c", f"{settings.temperature_c:g} °C"),
            ("modulus_frequencies_hz", "; ".join(written(f, "Hz") for f in hertz)),
            ("capacitance_frequency_hz", written(settings.capacitance_frequency_hz, "Hz")),
            ("mains_hz", written(settings.mains_hz, "Hz")),
            ("input_resistance_ohm", written(settings.input_resistance_ohm, "Ω")),
            ("input_capacitance_f", written(settings.input_capacitance_f, "F")),
        ):
            self.fields[name].show_text(text)
        run = None if campaign is None else campaign.open_lead
        stated = (settings.input_resistance_ohm, settings.input_capacitance_f) != (None, None)
        known = run is not None or stated
        self.leads.setChecked(settings.take_leads_away)
        # Taking the correction back must stay possible where the run has gone.
        self.leads.setEnabled(known or settings.take_leads_away)
        source = None if campaign is None else campaign.open_lead_source
        if run is not None:
            where = f" ({source.file})" if source else ""
            text = f"What lies in parallel is known from the open-lead run{where}."
        elif known:
            text = "What lies in parallel is taken from the stated input."
        else:
            text = "Needs an open-lead run, or the input as the maker states it."
        self.leads_note.setText(text)
        self.criteria.show_criteria(settings.criteria, self.tone)
        self.limits.show_limits(settings.limits, self.tone)
        self.thresholds.show_thresholds(dict(settings.thresholds), self.tone)

    def _set(self, **fields: Any) -> None:
        """Carry an edit out. Raises ValueError with the sentence where it is refused."""
        campaign = self.desk.campaign
        if campaign is None:
            return
        try:
            made = operations.edit_settings(campaign, **fields)
        except (OperationRefused, CampaignFileError) as error:
            raise ValueError(str(error)) from error
        if made.changes:
            self.desk.edit(operations.edit_settings, **fields)

    def _try(self, **fields: Any) -> None:
        try:
            self._set(**fields)
        except ValueError as error:
            self.desk.failed.emit(str(error))
