"""From files or words to results, in one call each; every room is loaded only when it is needed."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeAlias

from reconcile.records.limits import timed
from reconcile.records.settings import Settings

if TYPE_CHECKING:
    # each name said twice: the command line, which may not look into chemistry, takes these types from here
    from reconcile.chemistry.library import LibraryAnswer as LibraryAnswer
    from reconcile.chemistry.library import LibraryEntry as LibraryEntry
    from reconcile.chemistry.of_parts import PredictedParts as PredictedParts
    from reconcile.chemistry.trail import Trail as Trail
    from reconcile.records.book import BatchRecords
    from reconcile.records.meter_results import MeterHistory
    from reconcile.records.parts import Part
    from reconcile.records.pka_results import PkaFit
    from reconcile.records.problems import Problem
    from reconcile.records.results import Audit, Prediction
    from reconcile.records.substances import Catalogue

FilePath: TypeAlias = str | Path
SettingsLike: TypeAlias = Settings | FilePath | Mapping[str, Mapping[str, Any]] | None
"""Settings, the path of a settings file, its sections as a dictionary, or None for the defaults."""
ColumnsLike: TypeAlias = FilePath | Mapping[str, Mapping[str, Any]] | None
"""Path of a column map, or its content: kind of sheet -> heading as written -> field name."""
_HEADINGS = ("file-no-table", "no-readings", "column-twice")
"""Problems that a column map can mend."""
Progress: TypeAlias = Callable[[str, float | None], None]
"""Told what is being done, and the share of the whole that is done, 0 to 1; None where no share can be told."""


def settings_of(settings: SettingsLike = None) -> Settings:
    """Settings from whatever a caller has; raises SettingsError or InputProblems for a file that is not one."""
    if settings is None:
        return Settings()
    if isinstance(settings, Settings):
        return settings
    if isinstance(settings, Mapping):
        return Settings.from_sections(settings)
    from reconcile.importer.toml_files import read_settings

    return read_settings(Path(settings))


def read(*paths: FilePath, settings: SettingsLike = None, columns: ColumnsLike = None) -> BatchRecords:
    """The record that files hold together, with the place of every value.

    Parameters
    ----------
    *paths : str or Path
        Workbooks (.xlsx, .xlsm) and CSV files of one record; the order changes nothing but the order of rows.
    settings : Settings, path, mapping or None
        What differs from the defaults.
    columns : path, mapping or None
        Which heading stands for which column, for headings that are not recognised.

    Raises
    ------
    InputProblems, SettingsError
        A file is refused (all that stops the import is in `problems`); no such setting, or no such value of it.
    """
    return _read(paths, settings_of(settings), columns)


def _read(
    paths: Sequence[FilePath], settings: Settings, columns: ColumnsLike, names: Catalogue | None = None
) -> BatchRecords:
    """The same, with the substances known, by default the library's own."""
    from reconcile.importer.read import read_books
    from reconcile.importer.toml_files import read_column_map

    column_map = columns if columns is None or isinstance(columns, Mapping) else read_column_map(Path(columns))
    return read_books([Path(p) for p in paths], settings, column_map, names)


def write_columns(path: FilePath, *files: FilePath, settings: SettingsLike = None, columns: ColumnsLike = None) -> None:
    """Write a column map to complete: what each heading was taken for, or the headings where none was recognised.

    Raises FileExistsError rather than replace a file, and InputProblems where a file cannot be read at all.
    """
    from reconcile.importer.begin_map import begun_map_text
    from reconcile.importer.toml_files import column_map_text
    from reconcile.records.problems import InputProblems

    chosen = settings_of(settings)
    try:
        text = column_map_text(read(*files, settings=chosen, columns=columns))
    except InputProblems as refused:
        if any(problem.code not in _HEADINGS for problem in refused.problems):
            raise
        text = begun_map_text([Path(file) for file in files], chosen)
    with Path(path).open("x", encoding="utf-8") as file:
        file.write(text)


def predict_records(records: BatchRecords, settings: SettingsLike = None) -> Prediction:
    """Predicted pH of every used reading of a record, (n,), in the order of `records.readings`."""
    from reconcile.chemistry.predict import predict_records as predict

    chosen = settings_of(settings)
    return predict(_record([records], chosen, None), chosen)


def audit(
    *source: FilePath | BatchRecords,
    settings: SettingsLike = None,
    columns: ColumnsLike = None,
    progress: Progress | None = None,
) -> Audit:
    """The audit of a record: what was predicted, what stands out, what most likely caused it.

    Parameters
    ----------
    *source : str or Path, or one BatchRecords
        The files of the record, or the record as `read` gave it (then `columns` has been used already).
    settings, columns
        As for `read`.
    progress : callable or None
        Called with what is being done and the share of the whole that is done, None where no share can be told.

    Raises
    ------
    InputProblems, SettingsError
        As for `read`.
    """
    from reconcile.auditor.audit import audit as explain
    from reconcile.chemistry.library import constants_met
    from reconcile.chemistry.notices_of_record import noted
    from reconcile.chemistry.predict import predict_records as predict
    from reconcile.chemistry.predict import repredictor
    from reconcile.chemistry.shortcuts import shortcut_values

    chosen = settings_of(settings)
    say = timed(progress, chosen)
    say("reading the record", 0.0)
    records = _record(source, chosen, columns)
    say("predicting every reading", 0.2)
    prediction = predict(records, chosen)
    records = noted(records, prediction, chosen)
    say("searching for explanations", 0.3)
    found = explain(
        records,
        prediction,
        repredictor(records, chosen),
        chosen,
        progress=lambda doing: say(doing, None),
        shortcuts=lambda rows: shortcut_values(records, chosen, rows),
    )
    return replace(found, constants=constants_met(prediction, records.own))


def _record(
    source: Sequence[FilePath | BatchRecords], settings: Settings, columns: ColumnsLike, names: Catalogue | None = None
) -> BatchRecords:
    """The record of files, or the one given, with the amounts that a pH settles; raises TypeError for a mixture."""
    from reconcile.chemistry.adjusted import with_adjustments
    from reconcile.records.book import BatchRecords

    books = [one for one in source if isinstance(one, BatchRecords)]
    paths = [one for one in source if not isinstance(one, BatchRecords)]
    if books and (paths or len(books) > 1):
        raise TypeError("expected files, or one BatchRecords")
    record = books[0] if books else _read(paths, settings, columns, names)
    return with_adjustments(record, settings) if names is None else record


def meters(
    *source: FilePath | BatchRecords,
    settings: SettingsLike = None,
    columns: ColumnsLike = None,
    progress: Progress | None = None,
) -> MeterHistory:
    """Each meter and probe through time: calibrations against limits, and readings against predictions.

    Parameters
    ----------
    *source : str or Path, or one BatchRecords
        Calibrations alone are enough, so are readings of known solutions; an ordinary record gives both.
    settings, columns, progress
        As for `audit`.

    Raises
    ------
    InputProblems, SettingsError
        As for `read`.
    """
    from reconcile.auditor.meter_history import meter_history

    chosen = settings_of(settings)
    say = timed(progress, chosen)
    say("reading the record", 0.0)
    records = _record(source, chosen, columns)
    audited = audit(records, settings=chosen, progress=say) if len(records.readings) else None
    return meter_history(records, audited, chosen, progress=lambda doing: say(doing, None))


def fit_pka(
    *source: FilePath | BatchRecords,
    acid: str,
    settings: SettingsLike = None,
    columns: ColumnsLike = None,
    progress: Progress | None = None,
    **about: Any,
) -> PkaFit:
    """Ionization constants of one acid from the readings of every solution that holds it.

    Parameters
    ----------
    *source : str or Path, or one BatchRecords
        As for `audit`; an acid that the library does not hold needs the files.
    acid : str
        Name of a substance of the library, or of an unfamiliar one as the record calls it.
    settings, columns, progress
        As for `audit`.
    **about
        The rest of PkaQuestion. Of an unfamiliar acid: steps (by AICc when None), charge of its fully protonated form,
        protons_removed from it in what was weighed, counter_ion ("name:number"), molar_mass [g/mol]. Of any: free
        ("strength", "offset"), noise (standard deviation of a reading [pH]; estimated when None).

    Raises
    ------
    InputProblems, SettingsError
        As for `read`; where the question contradicts itself, or no reading bears on it.
    """
    from reconcile.fitter.fit import fit_pka as fit
    from reconcile.fitter.question import understood
    from reconcile.records.book import own_of_source
    from reconcile.records.pka_results import PkaQuestion

    chosen, question = settings_of(settings), PkaQuestion(acid, **about)
    names = understood(question, chosen, own_of_source(source)).names
    return fit(_record(source, chosen, columns, names), question, chosen, timed(progress, chosen))


DEFAULT_TEMPERATURE_C = 25.0
"""Temperature of a prediction that names none [°C]: that of the library's constants."""


def predict_parts(
    parts: Sequence[str],
    to: str = "",
    at: float = DEFAULT_TEMPERATURE_C,
    settings: SettingsLike = None,
    activity_model: str = "",
) -> PredictedParts:
    """The predicted pH of a solution given in words.

    Parameters
    ----------
    parts : sequence of str
        "0.1 M acetic acid" (a final concentration), "25 mL of 0.1 M sodium hydroxide" (a quantity taken).
    to : str
        What quantities are made up to: "100 mL", or "1 kg" of solution.
    at : float
        Temperature [°C].
    settings : Settings, path, mapping or None
        What differs from the defaults.
    activity_model : str
        Goes before the model in the settings; "" leaves it to them.

    Raises
    ------
    InputProblems
        A part cannot be read, its substance is unknown or ambiguous, or a total is missing.
    SettingsError
        The settings, or the activity model, are not among those allowed.
    """
    from reconcile.chemistry.of_parts import predict_composition
    from reconcile.records.parts import compose, parse_part
    from reconcile.records.problems import InputProblems

    chosen = settings_of(settings).but(prediction={"activity_model": activity_model} if activity_model else {})
    found: list[Part] = []
    problems: list[Problem] = []
    for text in parts:
        try:
            found.append(parse_part(text))
        except InputProblems as error:
            problems.extend(error.problems)
    if problems:
        raise InputProblems(problems)
    return predict_composition(compose(found, to), at, chosen)


def substances(word: str = "") -> LibraryAnswer:
    """The library of substances, or what of it a word concerns: a name, synonym, formula, or a part of a name."""
    from reconcile.chemistry.library import substances as concerned

    return concerned(word)
