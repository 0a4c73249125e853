"""The beam schedule: inputs, joined lines and results, one row a beam."""

from __future__ import annotations

from dataclasses import dataclass

from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

from sheets import paper
from sheets.design import Design, Member
from sheets.paper import Look

NAME = "Schedule"
FIRST = 9
"""The row of the first beam."""
SUPPORTS = 3
"""The most supports that a beam of the schedule has."""
COMBINATIONS = {"strength": "$V$1", "characteristic": "$V$2"}


@dataclass(frozen=True)
class Column:
    """A column of the schedule; a formula, where it has one, holds in every row."""

    key: str
    heading: str
    unit: str
    width: float
    look: Look
    formula: str | None = None


def _reactions(kind: str) -> list[Column]:
    return [
        Column(f"{kind}{n}", str(n), "kN", 6.8, FORCE, f"=reaction({{line}},{{loads}},{n},{{EI}},{{{kind}}})")
        for n in range(1, SUPPORTS + 1)
    ]


FORCE = paper.found("#,##0.0")
LENGTH = paper.given("0.00")
LOAD = paper.given("0.0")
AT_STRENGTH = "{line},{loads},,{EI},{strength}"
CHARACTERISTIC = "{line},{loads},,{EI},{characteristic}"

GIVEN = (
    Column("mark", "Beam", "", 5.5, paper.MARK),
    Column("where", "Member; how it is held", "", 19, paper.SMALL_TEXT),
    Column("L1", "L1", "m", 5.2, LENGTH),
    Column("L2", "L2", "m", 5.2, LENGTH),
    Column("L3", "L3", "m", 5.2, LENGTH),
    Column("E", "E", "GPa", 5, paper.given("0")),
    Column("I", "I", "cm⁴", 7.8, paper.given("#,##0")),
    Column("g", "Line G", "kN/m", 5.2, LOAD),
    Column("q", "Line Q", "kN/m", 5.2, LOAD),
    Column("from", "Q from", "m", 5.2, LENGTH),
    Column("to", "Q to", "m", 5.2, LENGTH),
    Column("gp", "Point G", "kN", 5.2, LOAD),
    Column("qp", "Point Q", "kN", 5.2, LOAD),
    Column("at", "Point at x", "m", 5.2, LENGTH),
    Column("other", "Other", "", 7.2, paper.given("General")),
    Column("what", "Other is", "", 10, paper.SMALL_TEXT),
    Column("pad1", "1", "", 4, paper.INPUT_TEXT),
    Column("pad2", "2", "", 4, paper.INPUT_TEXT),
    Column("pad3", "3", "", 4, paper.INPUT_TEXT),
)
LINES = (
    Column("EI", "EI", "kNm²", 7.5, Look(wrap=True, across="right", number="#,##0")),
    Column("line", "Beam line", "m", 18, paper.LINE_TEXT),
    Column("loads", "Loads line", "kN, m, kNm", 22, paper.LINE_TEXT),
)
FOUND = (
    *_reactions("strength"),
    *_reactions("characteristic"),
    Column("Mmax", "M max", "kNm", 6.8, FORCE, f"=moment_max({AT_STRENGTH})"),
    Column("Mmin", "M min", "kNm", 6.8, FORCE, f"=moment_min({AT_STRENGTH})"),
    Column("V", "|V| max", "kN", 6.8, FORCE, f"=MAX(shear_max({AT_STRENGTH}),-shear_min({AT_STRENGTH}))"),
    Column(
        "sag",
        "δ max",
        "mm",
        6.8,
        FORCE,
        f"=1000*MAX(deflection_max({CHARACTERISTIC}),-deflection_min({CHARACTERISTIC}))",
    ),
    Column("reference", "L", "m", 5.5, paper.found("0.00")),
    Column("ratio", "L/δ", "", 7.2, paper.found('"L/"0'), "=ROUND({reference}*1000/{sag},0)"),
    Column("limit", "Limit", "", 6, paper.given('"L/"0')),
    Column("status", "Check", "", 7.5, paper.STATUS, '=IF({ratio}>={limit},"OK","CHECK")'),
    Column(
        "balance",
        "ΣR less load",
        "kN",
        6.8,
        paper.found(paper.NOTHING),
        "=ROUND(SUM({characteristic1}:{characteristic3})"
        '-beam_result({line},{loads},"total load",{EI},{characteristic}),9)',
    ),
    Column("fault", "Fault (blank: none)", "", 24, paper.FAULT, "=fault({line},{loads},{EI},{strength})"),
)
COLUMNS = GIVEN + LINES + FOUND
LETTER = {column.key: get_column_letter(i) for i, column in enumerate(COLUMNS, 1)}
GROUPS = (
    ("Beam", "mark", "where", paper.GIVEN_HEAD),
    ("Lengths", "L1", "L3", paper.GIVEN_HEAD),
    ("Section", "E", "I", paper.GIVEN_HEAD),
    ("Loads: permanent G, variable Q", "g", "what", paper.GIVEN_HEAD),
    ("Pad at support", "pad1", "pad3", paper.GIVEN_HEAD),
    ("What the functions read", "EI", "loads", paper.FOUND_HEAD),
    ("Reaction at support, strength", "strength1", "strength3", paper.FOUND_HEAD),
    ("Reaction at support, characteristic", "characteristic1", "characteristic3", paper.FOUND_HEAD),
    ("Moment and shear, strength", "Mmax", "V", paper.FOUND_HEAD),
    ("Deflection, characteristic", "sag", "status", paper.FOUND_HEAD),
    ("Proof", "balance", "fault", paper.FOUND_HEAD),
)


def cells_of(row: int) -> dict[str, str]:
    """Return the cell of every column in `row`, and those of the two combinations."""
    return {key: f"${letter}{row}" for key, letter in LETTER.items()} | COMBINATIONS


def combination(kind: str) -> str:
    """Return the cell of a combination as other sheets name it."""
    return f"{NAME}!{COMBINATIONS[kind]}"


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the beam schedule."""
    design.issue.draw(
        sheet,
        1,
        "Beam schedule",
        "Every result is a formula on the cells of its row: change an input and the row follows.",
        left="A:P",
        block=("X:Y", "Z:AD", "AE:AG", "AH:AK"),
    )
    _legend(sheet)
    paper.widths(sheet, (column.width for column in COLUMNS))
    paper.heights(sheet, {4: 18, 5: 8, FIRST - 3: 28, FIRST - 2: 28, FIRST - 1: 14})
    for group, first, last, look in GROUPS:
        paper.put(sheet, f"{LETTER[first]}{FIRST - 3}:{LETTER[last]}{FIRST - 3}", group, look)
    for column in COLUMNS:
        head = paper.GIVEN_HEAD if column in GIVEN or column.key == "limit" else paper.FOUND_HEAD
        paper.put(sheet, f"{LETTER[column.key]}{FIRST - 2}", column.heading, head)
        paper.put(sheet, f"{LETTER[column.key]}{FIRST - 1}", column.unit, paper.UNIT)
    for row, member in enumerate(design.members, FIRST):
        _row(sheet, row, member)
    last_row = FIRST + len(design.members) - 1
    _summary(sheet, design, last_row)
    _guard(sheet, design, last_row)
    foot = last_row + 2
    paper.put(sheet, f"A{foot}:{LETTER['fault']}{foot}", "Notes", paper.SECTION)
    for row, (word, text) in enumerate(design.footnotes, foot + 1):
        paper.put(sheet, f"A{row}:B{row}", word, paper.STRONG_PROSE)
        paper.put(sheet, f"C{row}:{LETTER['fault']}{row}", text, paper.PROSE)
    sheet.freeze_panes = f"{LETTER['L1']}{FIRST}"
    paper.page(sheet, f"A1:{LETTER['fault']}{foot + len(design.footnotes)}", design.issue.footer)


def _row(sheet: Worksheet, row: int, member: Member) -> None:
    """Write the row of one beam."""
    values: dict[str, str | float] = {
        "mark": member.mark,
        "where": member.where,
        "E": member.modulus,
        "I": member.inertia,
        "EI": member.stiffness,
        "line": member.line,
        "loads": member.clauses,
        "reference": member.reference,
        "limit": member.limit,
        **{f"L{i}": length for i, length in enumerate(member.lengths, 1)},
        **{f"pad{i}": pad for i, pad in enumerate(member.pads, 1)},
        **member.loads,
    }
    if member.other:
        values["other"], values["what"] = member.other
    missing = range(len(member.pads) + 1, SUPPORTS + 1)
    dashes = {f"{kind}{i}" for kind in COMBINATIONS for i in missing}
    for column in COLUMNS:
        cell = f"{LETTER[column.key]}{row}"
        value = values.get(column.key, column.formula)
        if column.key in dashes:
            paper.put(sheet, cell, "–", paper.ABSENT)
        elif isinstance(value, str) and value.startswith("="):
            look = paper.found(column.look.number) if column in GIVEN else column.look
            paper.put(sheet, cell, value.format(**cells_of(row)), look)
        else:
            paper.put(sheet, cell, value, column.look)
    sheet.row_dimensions[row].height = 46


def _legend(sheet: Worksheet) -> None:
    """Show what the fills of the cells mean."""
    paper.put(sheet, "A4", 12.5, paper.given("0.0"))
    paper.put(sheet, "B4", "input: type here", paper.SUBTITLE)
    paper.put(sheet, "C4", 12.5, paper.found("0.0"))
    paper.put(sheet, "D4:F4", "formula: leave", paper.SUBTITLE)
    paper.put(sheet, "G4", "fixed 5 …", paper.LINE_TEXT)
    paper.put(sheet, "H4:P4", "text joined from cells, read by the functions", paper.SUBTITLE)


def _summary(sheet: Worksheet, design: Design, last: int) -> None:
    """Write the combinations and the number of beams that need attention."""
    checks, faults = (f"{LETTER[key]}{FIRST}:{LETTER[key]}{last}" for key in ("status", "fault"))
    entries = (
        ("Combination, strength", design.strength, paper.INPUT_TEXT),
        ("Combination, charact.", design.characteristic, paper.INPUT_TEXT),
        ("Deflections not met", f'=COUNTIF({checks},"CHECK")', paper.STATUS),
        ("Beams with a fault", f'=COUNTIF({faults},"?*")', paper.STATUS),
    )
    for row, (label, value, look) in enumerate(entries, 1):
        paper.put(sheet, f"U{row}", label, paper.BLOCK_LABEL)
        paper.put(sheet, f"V{row}", value, look)
    paper.alarm_when(sheet, "V3:V4", "V3>0")


def _guard(sheet: Worksheet, design: Design, last: int) -> None:
    """Guard the inputs, and colour what needs attention."""

    def block(first: str, final: str) -> str:
        return f"{LETTER[first]}{FIRST}:{LETTER[final]}{last}"

    marks = [pad.mark for pad in design.pads]
    paper.allow(sheet, block("L1", "I"), paper.positive(), "A length, E or I is a number above 0.")
    paper.allow(sheet, block("g", "other"), paper.any_number(), "A number, or blank.")
    paper.allow(sheet, block("pad1", "pad3"), paper.one_of(marks), f"One of {', '.join(marks)}.")
    paper.allow(sheet, block("limit", "limit"), paper.positive(), "The n of L/n, above 0.")
    first = cells_of(FIRST)
    paper.alarm_when(sheet, block("status", "status"), f'{first["status"]}="CHECK"')
    paper.alarm_when(sheet, block("balance", "balance"), f"ABS({first['balance']})>0.001")
    paper.alarm_when(sheet, block("fault", "fault"), f"LEN({first['fault']})>0")
