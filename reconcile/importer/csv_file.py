"""CSV files: encoding, delimiter and quoting settled strictly, with the line number of every record kept."""

from __future__ import annotations

import csv
import io
from collections import Counter
from itertools import zip_longest

import numpy as np

from reconcile.importer.raw import RawSheet
from reconcile.records.limits import beyond, check_size
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem, shown
from reconcile.records.settings import AUTO, Settings

DELIMITERS = {",": "comma", ";": "semicolon", "\t": "tab", "|": "vertical bar"}
_SAMPLE = 400


def read_csv(content: bytes, file: str, sha256: str, settings: Settings) -> RawSheet:
    """One CSV file as a sheet without a name; raises InputProblems where a choice is needed."""
    notes: list[Problem] = []
    text = _decoded(content, file, settings["reading.encoding"])
    text, declared = _declared_delimiter(text)
    if declared:
        notes.append(Problem("delimiter-declared", Place(file, "", 1), f"sep={declared}"))
    delimiter = _delimiter(text, file, settings["reading.delimiter"], declared)
    rows, numbers = _records(text, delimiter, file, 1 if declared else 0, settings)
    if len(rows) in (65536, 1048576):
        notes.append(Problem("file-maybe-cut", Place(file), str(len(rows))))
    widths = np.array([len(r) for r in rows], np.intp)
    columns = list(zip_longest(*rows, fillvalue="")) if rows else []
    return RawSheet(
        file,
        "",
        list(columns),
        np.array(numbers, np.intp),
        [str(i + 1) for i in range(len(columns))],
        sha256,
        text_cells=True,
        widths=widths,
        notes=notes,
    )


def _decoded(content: bytes, file: str, encoding: str) -> str:
    if encoding == AUTO:
        if content.startswith((b"\xff\xfe", b"\xfe\xff")):
            encoding = "utf-16"
        elif b"\x00" in content:
            raise InputProblems([Problem("file-nul", Place(file))])
        else:
            encoding = "utf-8-sig"
    elif encoding == "utf-8":
        encoding = "utf-8-sig"
    try:
        return content.decode(encoding)
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        begin = content.rfind(b"\n", 0, error.start) + 1
        end = content.find(b"\n", error.start)
        around = content[begin : end if end >= 0 else None].decode("cp1252", "replace").strip()
        raise InputProblems([Problem("file-encoding", Place(file, "", line), around)]) from None


def _declared_delimiter(text: str) -> tuple[str, str]:
    first, _, rest = text.partition("\n")
    first = first.strip().strip('"')
    if (first.lower().startswith("sep=") and len(first) == 5) or first.lower() == "sep=":
        declared = first[4:] or "\t"
        if declared in DELIMITERS:
            return rest, declared
    return text, ""


def _delimiter(text: str, file: str, wanted: str, declared: str) -> str:
    """The delimiter that the settings name, the file declares, or that gives nearly every line the same width."""
    if wanted != AUTO:
        return "\t" if wanted == "tab" else wanted
    if declared:
        return declared
    fits: dict[str, tuple[int, int]] = {}
    for delimiter in DELIMITERS:
        if delimiter not in text:
            continue
        try:
            lines = [
                r for _, r in zip(range(_SAMPLE), csv.reader(io.StringIO(text), delimiter=delimiter), strict=False)
            ]
        except csv.Error:
            continue
        widths = Counter(len(r) for r in lines if len(r) > 1)
        if widths:
            width, alike = widths.most_common(1)[0]
            whole = sum(1 for r in lines if any(c.strip() for c in r))
            if alike >= 0.6 * whole or alike >= whole - 12:  # title lines above the headings have fewer fields
                fits[delimiter] = (width, alike)
    if not fits:
        return ","
    if len(fits) == 1:
        return next(iter(fits))
    known = {d: _headings_recognised(text, d) for d in fits}
    best = max(known.values())
    best_fits = [d for d, n in known.items() if n == best]
    if len(best_fits) > 1 or best == 0:
        raise InputProblems(
            [
                Problem(
                    "delimiter-unclear",
                    Place(file),
                    " and ".join(DELIMITERS[d] for d in best_fits),
                )
            ]
        )
    return best_fits[0]


def _headings_recognised(text: str, delimiter: str) -> int:
    from reconcile.importer.headings import heading_matches

    lines = csv.reader(io.StringIO(text), delimiter=delimiter)
    return max((heading_matches(r) for _, r in zip(range(60), lines, strict=False)), default=0)


def _records(
    text: str, delimiter: str, file: str, offset: int, settings: Settings
) -> tuple[list[list[str]], list[int]]:
    """Records with the number of the line on which each begins; raises InputProblems over a limit."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    most, longest = int(settings["limits.rows"]), int(settings["limits.cell_chars"])
    before = csv.field_size_limit(longest)
    rows: list[list[str]] = []
    numbers: list[int] = []
    begin = 1
    try:
        for row in reader:
            rows.append(row)
            numbers.append(begin + offset)
            begin = reader.line_num + 1
            if len(rows) > most:
                raise beyond("limit-rows", f"over {most:,}", most, Place(file))
    except csv.Error as error:
        if "field limit" in str(error):
            raise beyond("limit-cell", f"over {longest:,}", longest, Place(file, "", begin + offset)) from None
        line = text.splitlines()[begin - 1] if begin <= len(text.splitlines()) else ""
        raise InputProblems(
            [Problem("csv-quote", Place(file, "", begin + offset), shown(line, 60), (("error", str(error)),))]
        ) from None
    finally:
        csv.field_size_limit(before)
    check_size(0, max(map(len, rows), default=0), settings, Place(file))
    return rows, numbers
