"""The library of substances as terminal text and as JSON."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from reconcile.cli.show import columns, hazard_words, heading, line, say

if TYPE_CHECKING:
    from reconcile.pipeline import LibraryAnswer, LibraryEntry

WEAK = "weak value: rests on an estimate, or on sources that differ by 0.1 or more"


def _acids(entry: LibraryEntry) -> tuple[str, ...]:
    return tuple(dict.fromkeys(constant.acid for constant in entry.constants))


def show(answer: LibraryAnswer, word: str) -> None:
    """The forms found, under the acids that they bring."""
    if answer.several:
        line(f"{word} may mean:", bold=True)
    groups: dict[tuple[str, ...], list[LibraryEntry]] = {}
    for entry in answer.entries:
        groups.setdefault(_acids(entry), []).append(entry)
    for acids, entries in groups.items():
        heading(" and ".join(acids) if acids else "Strong acids, strong bases and their salts: no ionization constant")
        constants = entries[0].constants
        if constants:
            columns(
                [
                    (
                        f"pKa{constant.step if len(constants) > 1 else ''} {constant.pka:g}",
                        f"u {constant.u:g}",
                        constant.acid if len(acids) > 1 else "",
                        "weak" if constant.weak else "",
                        constant.source,
                    )
                    for constant in constants
                ]
            )
        columns(
            [
                (form.name, form.formula, f"{form.molar_mass:.3f}", ", ".join(form.synonyms), hazard_words(form))
                for form in (entry.form for entry in entries)
            ],
            headings=("name", "formula", "g/mol", "also called", "hazard words"),
            right=(2,),
        )
    line()
    if answer.kin:
        line(f"Other forms of the same acid: {', '.join(answer.kin)}.")
    if any(constant.weak for entry in answer.entries for constant in entry.constants):
        line(f"weak = {WEAK}.")
    line("pKa at 25 °C and ionic strength 0; u is the standard uncertainty. The safety data sheet decides on hazards.")


def kept(names: list[str], where: str) -> None:
    """What is said of substances that were added."""
    line(f"Checked and kept in {where}:")
    for name in names:
        line(name, indent=2)
    line("Reports made from now on name the file and its SHA-256 in their manifest.")


def suggest(answer: LibraryAnswer, word: str) -> None:
    """What is said where nothing was found."""
    say(f'Nothing in the library is called "{word}".')
    if answer.near:
        say(f"Nearest: {', '.join(answer.near)}.")


def document(answer: LibraryAnswer, word: str) -> dict[str, Any]:
    """All of it as --json prints it."""
    return {
        "word": word,
        "ambiguous": answer.several,
        "near": answer.near,
        "other_forms": answer.kin,
        "substances": [
            {
                "name": entry.form.name,
                "synonyms": entry.form.synonyms,
                "formula": entry.form.formula,
                "molar_mass_g_mol": entry.form.molar_mass,
                "acids": _acids(entry),
                "protons_removed": entry.form.protons_removed if entry.form.acid else None,
                "constants": [
                    {
                        "acid": constant.acid,
                        "step": constant.step,
                        "pKa": constant.pka,
                        "u": constant.u,
                        "weak": constant.weak,
                        "from_memory": constant.verified == "memory",
                        "source": constant.source,
                    }
                    for constant in entry.constants
                ],
                "other_ions": entry.form.ions,
                "usual_liquid": entry.form.usual_liquid,
                "hazard": hazard_words(entry.form),
                "note": entry.form.note,
                "source": entry.form.source,
            }
            for entry in answer.entries
        ],
    }
