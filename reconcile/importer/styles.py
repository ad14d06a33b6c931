"""Number formats of a workbook: decimals shown, percent, leading zeros, durations."""

from __future__ import annotations

import re

_BUILT_IN = {
    1: "0", 2: "0.00", 3: "#,##0", 4: "#,##0.00", 9: "0%", 10: "0.00%", 11: "0.00E+00", 37: "#,##0", 38: "#,##0",
    39: "#,##0.00", 40: "#,##0.00", 46: "[h]:mm:ss", 48: "##0.0E+0", 49: "@",
}  # fmt: skip
"""Formats that a workbook names by number alone (ECMA-376 part 1, 18.8.30)."""


class Styles:
    """Cell styles by index, as the `s` attribute of a cell names them."""

    def __init__(self, data: bytes) -> None:
        own = {
            int(i): _text(code)
            for tag in re.findall(rb"<(?:\w+:)?numFmt\b[^>]*>", data)
            for i, code in [(_value(tag, rb"numFmtId"), _value(tag, rb"formatCode"))]
            if i.isdigit()
        }
        block = re.search(rb"<(?:\w+:)?cellXfs\b.*?</(?:\w+:)?cellXfs>", data, re.DOTALL)
        tags = re.findall(rb"<(?:\w+:)?xf\b[^>]*>", block.group(0)) if block else []
        self.formats: list[str] = []
        self.struck: list[bool] = []
        fonts_block = re.search(rb"<(?:\w+:)?fonts\b.*?</(?:\w+:)?fonts>", data, re.DOTALL)
        fonts = (
            re.findall(rb"<(?:\w+:)?font\b.*?(?:</(?:\w+:)?font>|/>)", fonts_block.group(0), re.DOTALL)
            if fonts_block
            else []
        )
        struck = [re.search(rb"<(?:\w+:)?strike\b(?![^>]*val=\"(?:0|false)\")", f) is not None for f in fonts]
        for tag in tags:
            number = _whole(_value(tag, rb"numFmtId"))
            self.formats.append(own.get(number, _BUILT_IN.get(number, "")))
            font = _whole(_value(tag, rb"fontId"))
            self.struck.append(font < len(struck) and struck[font])
        self.decimals = [decimals_of(f) for f in self.formats]
        self.percent = {i for i, f in enumerate(self.formats) if "%" in _bare(f)}
        self.padded = {
            i: len(m.group(0)) for i, f in enumerate(self.formats) if (m := re.fullmatch(r"0{2,}", _bare(f)))
        }
        self.duration = {i for i, f in enumerate(self.formats) if re.search(r"\[[hms]+\]", f, re.IGNORECASE)}


def _value(tag: bytes, name: bytes) -> bytes:
    match = re.search(rb"\b" + name + rb"\s*=\s*\"([^\"]*)\"", tag)
    return match.group(1) if match else b""


def _whole(data: bytes) -> int:
    """A whole number; 0, the general format, where there is none."""
    return int(data) if data.isdigit() and len(data) < 9 else 0


def _text(data: bytes) -> str:
    text = data.decode("utf-8", "replace")
    return text.replace("&quot;", '"').replace("&lt;", "<").replace("&gt;", ">").replace("&amp;", "&")


def _bare(code: str) -> str:
    """The first section of a format, without quoted text, escapes, colours and conditions."""
    code = re.sub(r'"[^"]*"|\\.|_.|\*.|\[(?![hms]+\])[^\]]*\]', "", code, flags=re.IGNORECASE)
    return code.split(";")[0].strip()


def decimals_of(code: str) -> int:
    """Decimals that a number format shows; -1 where it does not say (General, text, dates, scientific)."""
    bare = _bare(code)
    match = re.fullmatch(r"[#0?,]*(?:\.([0]+))?", bare)
    if not bare or match is None or "0" not in bare:
        return -1
    return len(match.group(1) or "")
