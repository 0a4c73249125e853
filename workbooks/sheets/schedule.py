"""The beam schedule: inputs, joined lines and results, one row a beam."""

from __future__ import annotations

from dataclasses import dataclass, replace

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
COMBINATIONS = {"strength": "$V$2", "characteristic": "$V$3"}
CASES = {"G": "W", "Q": "X", "S": "Y", "T": "Z"}
"""The load cases, and the columns of the factors that the combinations give them."""


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
        Column(f"{kind}{n}", str(n), "kN", 7.2, FORCE, f"=reaction({{line}},{{loads}},{n},{{EI}},{{{kind}}})")
        for n in range(1, SUPPORTS + 1)
    ]


FORCE = paper.found("#,##0.0")
LENGTH = paper.given("0.00")
LOAD = paper.given("0.0")
AT_STRENGTH = "{line},{loads},,{EI},{strength}"
CHARACTERISTIC = "{line},{loads},,{EI},{characteristic}"

GIVEN = (
    Column("mark", "Beam", "", 6.2, paper.MARK),
    Column("where", "Member; how it is held", "", 21.5, paper.SMALL_TEXT),
    Column("L1", "L1", "m", 5.6, LENGTH),
    Column("L2", "L2", "m", 5.6, LENGTH),
    Column("L3", "L3", "m", 5.6, LENGTH),
    Column("E", "E", "GPa", 5.4, paper.given("0")),
    Column("I", "I", "cm⁴", 9.2, paper.given("#,##0")),
    Column("g", "Line G", "kN/m", 5.8, LOAD),
    Column("q", "Line Q", "kN/m", 5.8, LOAD),
    Column("from", "Q from", "m", 5.6, LENGTH),
    Column("to", "Q to", "m", 5.6, LENGTH),
    Column("gp", "Point G", "kN", 5.8, LOAD),
    Column("qp", "Point Q", "kN", 5.8, LOAD),
    Column("at", "Point at x", "m", 5.6, LENGTH),
    Column("other", "Other", "", 8.2, paper.given("General")),
    Column("what", "Other is", "", 11.4, paper.SMALL_TEXT),
    Column("pad1", "1", "", 4.6, paper.INPUT_TEXT),
    Column("pad2", "2", "", 4.6, paper.INPUT_TEXT),
    Column("pad3", "3", "", 4.6, paper.INPUT_TEXT),
)
LINES = (
    Column("EI", "EI", "kNm²", 9.2, Look(wrap=True, across="right", indent=1, number="#,##0")),
    Column("line", "Beam line", "m", 18, paper.LINE_TEXT),
    Column("loads", "Loads line", "kN, m, kNm", 23, paper.LINE_TEXT),
)
FOUND = (
    *_reactions("strength"),
    *_reactions("characteristic"),
    Column("Mmax", "M max", "kNm", 7.2, FORCE, f"=moment_max({AT_STRENGTH})"),
    Column("Mmin", "M min", "kNm", 7.2, FORCE, f"=moment_min({AT_STRENGTH})"),
    Column("V", "|V| max", "kN", 7.2, FORCE, f"=MAX(shear_max({AT_STRENGTH}),-shear_min({AT_STRENGTH}))"),
    Column(
        "sag",
        "δ max",
        "mm",
        7,
        FORCE,
        f"=1000*MAX(deflection_max({CHARACTERISTIC}),-deflection_min({CHARACTERISTIC}))",
    ),
    Column("reference", "L", "m", 5.5, paper.found("0.00")),
    Column("ratio", "L/δ", "", 8.6, paper.found('"L/"0'), "={reference}*1000/{sag}"),
    Column("limit", "Limit", "", 7, paper.given('"L/"0')),
    Column("status", "Check", "", 8, paper.STATUS, '=IF({ratio}>={limit},"OK","CHECK")'),
    Column(
        "balance",
        "ΣR less load",
        "kN",
        7.4,
        paper.found(paper.NOTHING),
        "=ROUND(SUM({characteristic1}:{characteristic3})"
        '-beam_result({line},{loads},"total load",{EI},{characteristic}),9)',
    ),
    Column(
        "fault",
        "Fault (blank: none)",
        "",
        15,
        paper.FAULT,
        '=fault({line},{loads},{EI},{strength})&IF(ISERROR(SUM({strength1}:{balance}))," [error in the row]","")',
    ),
)
COLUMNS = GIVEN + LINES + FOUND
LETTER = {column.key: get_column_letter(i) for i, column in enumerate(COLUMNS, 1)}
GROUPS = (
    ("Beam", "mark", "where", paper.GIVEN_HEAD),
    ("Lengths", "L1", "L3", paper.GIVEN_HEAD),
    ("Section", "E", "I", paper.GIVEN_HEAD),
    ("Loads", "g", "what", paper.GIVEN_HEAD),
    ("Pad at support", "pad1", "pad3", paper.GIVEN_HEAD),
    ("What the functions read", "EI", "loads", paper.FOUND_HEAD),
    ("Reaction at support, strength", "strength1", "strength3", paper.FOUND_HEAD),
    ("Reaction at support, characteristic", "characteristic1", "characteristic3", paper.FOUND_HEAD),
    ("M and V, strength", "Mmax", "V", paper.FOUND_HEAD),
    ("Deflection, characteristic", "sag", "status", paper.FOUND_HEAD),
    ("Proof", "balance", "fault", paper.FOUND_HEAD),
)


def cells_of(row: int) -> dict[str, str]:
    """Return the cell of every column in `row`, and those of the two combinations."""
    return {key: f"${letter}{row}" for key, letter in LETTER.items()} | COMBINATIONS


def combination(kind: str) -> str:
    """Return the cell of a combination as other sheets name it."""
    return f"{NAME}!{COMBINATIONS[kind]}"


def factor(kind: str, case: str) -> str:
    """Return the cell of the factor that a combination gives a case, as other sheets name it."""
    return f"{NAME}!${CASES[case]}{COMBINATIONS[kind][2:]}"


def draw(sheet: Worksheet, design: Design) -> None:
    """Draw the beam schedule."""
    design.issue.draw(
        sheet,
        1,
        "Beam schedule",
        "Every result is a formula on the cells of its row: change an input and the row follows.",
        left="A:S",
        block=("AD:AE", "AF:AI", "AJ:AK", "AL"),
    )
    _legend(sheet)
    paper.widths(sheet, (column.width for column in COLUMNS))
    paper.heights(sheet, {4: 22, 5: 8, FIRST - 3: 34, FIRST - 2: 34, FIRST - 1: 17})
    for group, first, last, look in GROUPS:
        paper.put(sheet, f"{LETTER[first]}{FIRST - 3}:{LETTER[last]}{FIRST - 3}", group, look)
    for column in COLUMNS:
        head = paper.GIVEN_HEAD if column in GIVEN or column.key == "limit" else paper.FOUND_HEAD
        paper.put(sheet, f"{LETTER[column.key]}{FIRST - 2}", column.heading, head)
        paper.put(sheet, f"{LETTER[column.key]}{FIRST - 1}", column.unit, paper.UNIT)
    for row, member in enumerate(design.members, FIRST):
        _row(sheet, row, member)
    last_row = FIRST + len(design.members) - 1
    _combinations(sheet, design)
    _summary(sheet, last_row)
    _guard(sheet, design)
    foot = last_row + 2
    paper.put(sheet, f"A{foot}:{LETTER['fault']}{foot}", "Notes", paper.SECTION)
    for row, (word, text) in enumerate(design.footnotes, foot + 1):
        paper.put(sheet, f"A{row}:B{row}", word, paper.STRONG_PROSE)
        paper.put(sheet, f"C{row}:{LETTER['fault']}{row}", text, paper.PROSE)
        sheet.row_dimensions[row].height = 19
    sheet.freeze_panes = f"{LETTER['L1']}{FIRST}"
    paper.page(sheet, f"A1:{LETTER['fault']}{foot + len(design.footnotes)}", design.issue.footer)


def _values(member: Member) -> dict[str, str | float]:
    """Return what the row of a beam holds by itself, by the keys of the columns."""
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
    return values


def _not_used(member: Member) -> set[str]:
    """Return the columns of inputs that no formula of the row reads."""
    values = _values(member)
    formulas = "".join(value for value in values.values() if isinstance(value, str) and value.startswith("="))
    read = {key for key in LETTER if f"{{{key}}}" in formulas} | {f"pad{i}" for i, _ in enumerate(member.pads, 1)}
    if "other" in read:
        read.add("what")
    unused = {column.key for column in GIVEN} - read - {"mark", "where"}
    assert not unused & values.keys(), f"{member.mark}: {unused & values.keys()} given and not read"
    return unused


def _row(sheet: Worksheet, row: int, member: Member) -> None:
    """Write the row of one beam."""
    values = _values(member)
    unused = _not_used(member)
    missing = range(len(member.pads) + 1, SUPPORTS + 1)
    dashes = {f"{kind}{i}" for kind in COMBINATIONS for i in missing}
    for column in COLUMNS:
        cell = f"{LETTER[column.key]}{row}"
        value = values.get(column.key, column.formula)
        if column.key in unused:
            paper.put(sheet, cell, None, paper.NOT_USED)
        elif column.key in dashes:
            paper.put(sheet, cell, "–", paper.ABSENT)
        elif isinstance(value, str) and value.startswith("="):
            look = replace(column.look, fill=None) if column in GIVEN else column.look
            paper.put(sheet, cell, value.format(**cells_of(row)), look)
        else:
            paper.put(sheet, cell, value, column.look)
    sheet.row_dimensions[row].height = 50


def _legend(sheet: Worksheet) -> None:
    """Show what the fills of the cells mean."""
    paper.put(sheet, "A4", 12.5, paper.given("0.0"))
    paper.put(sheet, "B4", "input: type here", paper.LEGEND)
    paper.put(sheet, "C4", None, paper.NOT_USED)
    paper.put(sheet, "D4:G4", "not used by this row", paper.LEGEND)
    paper.put(sheet, "H4", 12.5, paper.found("0.0"))
    paper.put(sheet, "I4:K4", "formula: leave", paper.LEGEND)
    paper.put(sheet, "L4:M4", "fixed 5 …", paper.LINE_TEXT)
    paper.put(sheet, "N4:S4", "text joined from cells, for the functions", paper.LEGEND)


def _combinations(sheet: Worksheet, design: Design) -> None:
    """Write the combinations, the factors that the functions read from them, and whether they know their cases.

    The total of a unit load in a case is the factor of the case.
    """
    paper.put(sheet, "U1", "Combination", paper.GIVEN_HEAD)
    paper.put(sheet, "V1", "as typed", paper.GIVEN_HEAD)
    for case, letter in CASES.items():
        paper.put(sheet, f"{letter}1", case, paper.FOUND_HEAD)
    paper.put(sheet, "AA1:AB1", "Check", paper.FOUND_HEAD)
    factors = f"{min(CASES.values())}{{0}}:{max(CASES.values())}{{0}}"
    texts = {"strength": design.strength, "characteristic": design.characteristic}
    for kind, typed in COMBINATIONS.items():
        row = int(typed[3:])
        paper.put(sheet, f"U{row}", kind.capitalize(), paper.BLOCK_LABEL)
        paper.put(sheet, f"V{row}", texts[kind], paper.INPUT_TEXT)
        for case, letter in CASES.items():
            factor = f'=beam_result("fixed 1 free","{case}: point 1 at 1","total load",,{typed})'
            paper.put(sheet, f"{letter}{row}", factor, paper.found("0.00"))
        numbers = factors.format(row)
        terms = f'1+2*LEN({typed})-LEN(SUBSTITUTE({typed},"+",""))-LEN(SUBSTITUTE({typed},"-",""))'
        known = f'IF({terms}=COUNTIF({numbers},"<>0"),"OK","case?")'
        check = f'=IF(LEN(TRIM({typed}))=0,"blank",IF(ISERROR(SUM({numbers})),"unreadable",{known}))'
        paper.put(sheet, f"AA{row}:AB{row}", check, paper.STATUS)
        paper.alarm_when(sheet, f"V{row}", f'$AA{row}<>"OK"')
        paper.alarm_when(sheet, f"AA{row}:AB{row}", f'$AA{row}<>"OK"')
        paper.alarm_when(sheet, numbers, f"IF(ISERROR(W{row}),TRUE,W{row}=0)")


def _summary(sheet: Worksheet, last: int) -> None:
    """Write the number of beams that need attention: all that are not known to be well."""
    marks, checks, faults = (f"{LETTER[key]}{FIRST}:{LETTER[key]}{last}" for key in ("mark", "status", "fault"))
    paper.put(sheet, "U4", "Deflections not met", paper.BLOCK_LABEL)
    paper.put(sheet, "V4", f'=ROWS({marks})-COUNTIF({checks},"OK")', paper.STATUS)
    paper.put(sheet, "W4:Z4", "Beams with a fault", paper.BLOCK_LABEL)
    paper.put(sheet, "AA4:AB4", f'=ROWS({marks})-COUNTIF({faults},"")', paper.STATUS)
    for cells in ("V4", "AA4:AB4"):
        first = cells.split(":")[0]
        paper.alarm_when(sheet, cells, f"IF(ISERROR(${first}),TRUE,${first}>0)")


def _guard(sheet: Worksheet, design: Design) -> None:
    """Guard the inputs, and colour what needs attention."""
    unused = {member.mark: _not_used(member) for member in design.members}
    rows = {member.mark: row for row, member in enumerate(design.members, FIRST)}

    def used(*keys: str) -> str:
        return " ".join(f"{LETTER[key]}{row}" for key in keys for mark, row in rows.items() if key not in unused[mark])

    refused = " ".join(f"{LETTER[key]}{rows[mark]}" for mark, keys in unused.items() for key in sorted(keys))
    paper.allow(sheet, refused, paper.nothing(), "The lines of this row do not read this cell. Change them first.")
    marks = [pad.mark for pad in design.pads]
    paper.allow(sheet, used("L1", "L2", "L3", "E", "I"), paper.positive(), "A length, E or I is a number above 0.")
    numbers = ("g", "q", "from", "to", "gp", "qp", "at", "other")
    paper.allow(sheet, used(*numbers), paper.any_number(), "A number, or blank.")
    paper.allow(sheet, used("pad1", "pad2", "pad3"), paper.one_of(marks), f"One of {', '.join(marks)}.")
    paper.allow(sheet, used("limit"), paper.positive(), "The n of L/n, above 0.")

    def block(key: str) -> str:
        return f"{LETTER[key]}{FIRST}:{LETTER[key]}{FIRST + len(design.members) - 1}"

    first = cells_of(FIRST)
    status, fault = first["status"], first["fault"]
    paper.alarm_when(sheet, block("status"), f'IF(ISERROR({status}),TRUE,{status}<>"OK")')
    paper.alarm_unless_nothing(sheet, block("balance"))
    paper.alarm_when(sheet, block("fault"), f"IF(ISERROR({fault}),TRUE,LEN({fault})>0)")
