"""Every default that a site may change: one row each, with unit and reason."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any


@dataclass(frozen=True)
class Setting:
    """One key of a settings file: section, key, default, unit, reason, and the values allowed ((), if any).

    listed : where a list of values serves too, what it may hold beside those allowed alone
    """

    section: str
    key: str
    default: Any
    unit: str
    reason: str
    allowed: tuple[str, ...] = ()
    listed: tuple[str, ...] = ()

    @property
    def name(self) -> str:
        return f"{self.section}.{self.key}"


AUTO = "auto"
ION_PAIRS = (
    *("HF2-", "CaOH+", "MgOH+", "B2O(OH)5-", "B3O3(OH)4-", "B4O5(OH)4(2-)", "NaB(OH)4", "NaHPO4-", "KHPO4-", "NaCO3-"),
    *("Na citrate(2-)", "K citrate(2-)", "Na phthalate-", "K phthalate-"),
)
"""Names of chemistry/ion_pairs.csv."""
SETTINGS: tuple[Setting, ...] = (
    Setting(
        "reading",
        "encoding",
        AUTO,
        "",
        "byte-order mark, then strict UTF-8; anything else must be named",
        (AUTO, "utf-8", "utf-16", "cp1252"),
    ),
    Setting(
        "reading", "delimiter", AUTO, "", "the one that gives every line the same width", (AUTO, ",", ";", "tab", "|")
    ),
    Setting("reading", "decimal", AUTO, "", "settled per column from its unambiguous cells", (AUTO, ".", ",")),
    Setting(
        "reading",
        "date_order",
        AUTO,
        "",
        "settled per column from its unambiguous cells",
        (AUTO, "day-month", "month-day"),
    ),
    Setting(
        "reading",
        "blank_batch",
        "ask",
        "",
        "a blank batch may mean the one above, or a slip; nothing is filled in unasked",
        ("ask", "above", "missing"),
    ),
    Setting("reading", "two_digit_years", "ask", "", "the century is not guessed", ("ask", "2000")),
    Setting(
        "reading", "time_zone", "ask", "", "times are local wall time; a zone beside them is not", ("ask", "ignore")
    ),
    Setting("reading", "leading_zeros", "ask", "", "12 and 0012 may be one name or two", ("ask", "apart")),
    Setting("reading", "hidden_rows", "read", "", "hidden is not deleted", ("read", "leave out")),
    Setting(
        "prediction",
        "activity_model",
        "bates-guggenheim",
        "",
        "the convention of the pH scale; nearest to published buffer tables of those with one term for all ions",
        ("davies", "extended", "ideal", "bates-guggenheim", "truesdell-jones", "specific"),
    ),
    Setting(
        "prediction",
        "pk_equations",
        True,
        "",
        "published equations from emf cells, within their range, before a constant heat capacity",
    ),
    Setting(
        "prediction",
        "ion_pairs",
        "complexes",
        "",
        "hydrogen difluoride, hydroxides of calcium and magnesium, polyborates; all: sodium and potassium pairs too, "
        "whose effect the activity coefficients hold already",
        ("none", "complexes", "all"),
        ION_PAIRS,
    ),
    Setting("prediction", "room_temperature_c", 22.0, "°C", "common practice, no source"),
    Setting("prediction", "open_to_air", False, "", "closed vessels are the rule; carbon dioxide is then left out"),
    Setting("prediction", "co2_partial_pressure_atm", 4.2e-4, "atm", "present outdoor air, about 420 ppm"),
    Setting("uncertainty", "meter_accuracy", 0.02, "pH, half-width", "reproduces to 0.02 pH (USP 32 <791>)"),
    Setting("uncertainty", "meter_span_percent", 0.5, "%, half-width", "common practice, no source"),
    Setting(
        "uncertainty",
        "session",
        0.0,
        "pH, standard deviation",
        "least spread between calibration sessions; the record's own estimate is used above it",
    ),
    Setting("uncertainty", "lot_strength_percent", 1.0, "%, half-width", "common practice, no source"),
    Setting("uncertainty", "weighing_percent", 0.1, "%, half-width", "balance, as used; common practice, no source"),
    Setting(
        "uncertainty", "volume_percent", 0.2, "%, half-width", "pipette or volumetric flask; common practice, no source"
    ),
    Setting("uncertainty", "preparation_percent", 0.3, "%, half-width", "common practice, no source"),
    Setting("uncertainty", "temperature_k", 0.5, "K, half-width", "common practice, no source"),
    Setting("uncertainty", "room_temperature_k", 2.0, "K, half-width", "common practice, no source"),
    Setting(
        "uncertainty", "stock_ph", 0.05, "pH, half-width", "a stock's stated pH has one decimal, and it was read once"
    ),
    Setting("uncertainty", "noise_floor", 0.005, "pH, standard deviation", "common practice, no source"),
    Setting("uncertainty", "davies_coefficient", 0.1, "-, standard uncertainty", "Davies' 0.3 is quoted as 0.2 to 0.4"),
    Setting(
        "uncertainty",
        "linear_coefficient",
        0.05,
        "-, standard uncertainty",
        "linear term that the Bates-Guggenheim equation leaves out, over A I; from published interaction coefficients",
    ),
    Setting(
        "uncertainty",
        "carbon_dioxide_umol_kg",
        14.0,
        "µmol/kg, half-width",
        "what water takes up in equilibrium with outdoor air at 25 °C; uptake that is not recorded",
    ),
    Setting("limits", "inflated_mib", 512, "MiB", "a file of a million readings, once inflated, is smaller"),
    Setting("limits", "rows", 2000000, "rows", "of one sheet; a spreadsheet has 1,048,576"),
    Setting("limits", "columns", 16384, "columns", "of one sheet; what a spreadsheet has"),
    Setting("limits", "sheet_cells", 20000000, "cells", "of the rectangle that a sheet spans; more takes gigabytes"),
    Setting("limits", "cell_chars", 32767, "characters", "what a spreadsheet cell can hold"),
    Setting("limits", "candidates", 200000, "candidates", "explanations weighed against each other at one time"),
    Setting("limits", "minutes", 120.0, "min", "of reading, predicting and searching; a million readings take less"),
    Setting("status", "stands_out_z", 3.0, "-", "z against the full spread of a clean record"),
    Setting(
        "status",
        "outside_model_ionic_strength",
        0.5,
        "mol/kg",
        "above, the uncertainty of activity coefficients is little known",
    ),
    Setting("status", "electrode_low_ph", 1.0, "pH", "acid error of the glass electrode"),
    Setting("status", "electrode_high_ph", 12.0, "pH", "sodium error of the glass electrode"),
    Setting("status", "electrode_low_ionic_strength", 0.001, "mol/kg", "slow and flow-sensitive readings below"),
    Setting("status", "unbuffered_mmol_per_ph", 0.2, "mmol/L per pH", "readings of water say nothing about a meter"),
    Setting("audit", "alarm_rate", 0.05, "-", "chance of any finding in a whole clean record"),
    Setting("audit", "reach", 3.0, "ln likelihood", "explanations closer than this to the best cannot be told apart"),
    Setting("audit", "known_acid_log_odds", 2.0, "ln odds", "an acid already in the record is likelier in a bottle"),
    Setting("audit", "detectable_power", 0.9, "-", "power at which the smallest detectable fault is stated"),
    Setting("meters", "slope_low_percent", 90.0, "%", "USP <791>, revision of 2016; the European text has 95"),
    Setting(
        "meters",
        "other_slope_low_percent",
        95.0,
        "%",
        "Ph. Eur. 2.2.3, recent text (from memory); shown beside the limit above, nothing is counted by it; 0 for none",
    ),
    Setting("meters", "slope_high_percent", 105.0, "%", "USP <791>, revision of 2016"),
    Setting("meters", "offset_limit_mv", 30.0, "mV", "USP <791>, revision of 2016"),
    Setting("substances", "without_effect", (), "names", "declared by the site: no effect on pH (a protein, a dye)"),
    Setting(
        "substances",
        "without_effect_allowance",
        0.02,
        "pH, standard uncertainty",
        "added to the prediction of a solution that holds such a substance; common practice, no source",
    ),
)
BY_NAME: Mapping[str, Setting] = {s.name: s for s in SETTINGS}


class SettingsError(ValueError):
    """A settings file names a key that does not exist, or gives a value that it cannot take."""


def _checked(setting: Setting, value: Any) -> Any:
    default = setting.default
    if isinstance(default, bool):
        good = isinstance(value, bool)
    elif isinstance(default, (int, float)):
        good = isinstance(value, (int, float)) and not isinstance(value, bool) and value >= 0
    elif isinstance(default, tuple):
        good = isinstance(value, (list, tuple)) and all(isinstance(v, str) for v in value)
        value = tuple(value) if good else value
    elif setting.listed and isinstance(value, (list, tuple)):
        good = all(one in (*setting.allowed, *setting.listed) for one in value)
        value = tuple(dict.fromkeys(value)) if good else value
    else:
        good = isinstance(value, str) and (not setting.allowed or value in setting.allowed)
    if not good:
        wanted = f"one of {', '.join(setting.allowed)}" if setting.allowed else f"a value such as {default!r}"
        if setting.listed:
            wanted += f", or a list of these and of {', '.join(setting.listed)}"
        raise SettingsError(f"setting {setting.name} reads {value!r}; expected {wanted}")
    return float(value) if isinstance(default, float) else value


@dataclass(frozen=True)
class Settings:
    """All settings of one run; `settings["prediction.activity_model"]` gives a value.

    changed : only what differs from the defaults, by full name
    """

    changed: Mapping[str, Any] = field(default_factory=dict)

    @classmethod
    def from_sections(cls, sections: Mapping[str, Any]) -> Settings:
        """Settings from a parsed settings file, {section: {key: value}}; raises SettingsError."""
        changed: dict[str, Any] = {}
        for section, keys in sections.items():
            if not isinstance(keys, Mapping):
                raise SettingsError(f"settings: {section} must be a section, such as [{section}]")
            for key, value in keys.items():
                setting = BY_NAME.get(f"{section}.{key}")
                if setting is None:
                    near = ", ".join(s.name for s in SETTINGS if s.section == section or s.key == key)
                    raise SettingsError(
                        f"no setting is called {section}.{key}; there are: {near or ', '.join(BY_NAME)}"
                    )
                value = _checked(setting, value)
                if value != setting.default:
                    changed[setting.name] = value
        return cls(changed)

    def but(self, **sections: Mapping[str, Any]) -> Settings:
        """The same settings with some changed, by section; raises SettingsError."""
        given = {f"{section}.{key}" for section, keys in sections.items() for key in keys}
        kept = {name: value for name, value in self.changed.items() if name not in given}
        return Settings({**kept, **Settings.from_sections(sections).changed})

    def __getitem__(self, name: str) -> Any:
        return self.changed.get(name, BY_NAME[name].default)

    def rows(self) -> list[tuple[str, Any, str, str, bool]]:
        """Every setting as (name, value, unit, reason, differs from default)."""
        return [(s.name, self[s.name], s.unit, s.reason, s.name in self.changed) for s in SETTINGS]
