"""Build the design workbook of the Kestrel Quay boat store: `python kestrel_quay.py [OUT.xlsx]`.

The boat store is invented. The workbook holds inputs and formulas, no values: a host of the
worksheet functions, or `beamfuncs fill`, computes it. Beside it stands the same workbook with
the VBA project of xlwings' template, as .xlsm.
"""

from __future__ import annotations

import sys
from datetime import date
from pathlib import Path

from openpyxl import Workbook
from sheets import actions, foundations, in_depth, macros, notes, paper, schedule, understood
from sheets.design import Crossed, Design, LaidOut, Member, Pad
from sheets.paper import TitleBlock
from sheets.writing import write

BOOK = Path(__file__).with_suffix(".xlsx")

# The schedule: one member a beam. In the formulas {L1}, {g} ... are cells of its row ------------

AREA = '="G: udl "&{g}&"; Q: udl "&{q}'
AREA_LINE = '=load_line("G: udl",{g},"; Q: udl",{q})'
POINTS = '"; G: point "&{gp}&" at "&{at}&"; Q: point "&{qp}&" at "&{at}'

MEMBERS = (
    Member(
        "B1",
        "Sail loft trimmer, glulam; simple span",
        (5.4,),
        12,
        45_000,
        {"g": 2.1, "q": 4.0},
        ("P1", "P2"),
        '="pinned "&{L1}&" roller"',
        AREA,
    ),
    Member(
        "B2",
        "Loft balcony beam; overhangs at one end, rail post at the tip",
        (6.0, 1.5),
        210,
        8_400,
        {"g": 4.5, "q": 7.5, "qp": 6.0, "at": "={L1}+{L2}"},
        ("P1", "P3"),
        '="pinned "&{L1}&" roller "&{L2}&" free"',
        AREA + '&"; Q: point "&{qp}&" at "&{at}',
        reference="=MIN({L1},2*{L2})",
    ),
    Member(
        "B3",
        "Boat rack bearer; overhangs at both ends",
        (1.2, 3.6, 1.2),
        210,
        2_400,
        {"g": 0.8, "q": 9.0},
        ("P2", "P4"),
        '="free "&{L1}&" pinned "&{L2}&" roller "&{L3}&" free"',
        AREA,
        reference="=MIN({L2},2*{L1},2*{L3})",
    ),
    Member(
        "B4",
        "Office floor beam; built in at the core wall, propped",
        (5.0,),
        210,
        4_600,
        {"g": 5.0, "q": 7.5},
        ("P5", "P3"),
        '=beam_line("fixed",{L1},"pinned")',
        AREA_LINE,
        limit=360,
    ),
    Member(
        "B5",
        "Winch plinth beam, concrete; built in at both ends",
        (4.2,),
        33,
        213_000,
        {"g": 6.0, "q": 2.0, "gp": 18.0, "qp": 60.0, "at": 1.8},
        ("P5", "P9"),
        '=beam_line("fixed",{L1},"fixed")',
        AREA + "&" + POINTS,
        limit=500,
    ),
    Member(
        "B6",
        "Store floor main beam; two unequal spans",
        (6.5, 4.8),
        210,
        21_000,
        {"g": 9.0, "q": 15.0},
        ("P1", "P4", "P6"),
        '="pinned "&{L1}&" roller "&{L2}&" roller"',
        AREA,
        reference="=MAX({L1},{L2})",
        limit=360,
    ),
    Member(
        "B7",
        "Gallery walkway; drop-in part on a hinge",
        (5.6, 1.4, 4.2),
        210,
        5_200,
        {"g": 2.4, "q": 6.0},
        ("P2", "P3", "P7"),
        '="pinned "&{L1}&" pinned "&{L2}&" hinge "&{L3}&" pinned"',
        AREA,
        reference="=MIN({L1},{L2}+{L3})",
    ),
    Member(
        "B8",
        "Yard beam, glulam; middle support on made ground (spring)",
        (4.0, 4.0),
        12,
        36_000,
        {"g": 1.2, "q": 3.0},
        ("P6", "P10", "P7"),
        '=beam_line("pinned",{L1},"spring(",{other},")",{L2},"pinned")',
        AREA,
        (2_400, "kN/m spring"),
        "={L1}+{L2}",
        250,
    ),
    Member(
        "B9",
        "Quay edge beam, concrete; middle support settles",
        (5.2, 6.0),
        33,
        260_000,
        {"g": 11.0, "q": 10.0},
        ("P4", "P8", "P5"),
        '=beam_line("pinned",{L1},"roller",{L2},"roller")',
        '=load_line("G: udl",{g},"; Q: udl",{q},"; S: settle",{other}/1000,"at support 2")',
        (6, "mm settlement"),
        "=MAX({L1},{L2})",
    ),
    Member(
        "B10",
        "Slipway beam; hull load over the part next to the prop",
        (7.2,),
        210,
        16_500,
        {"g": 4.0, "q": 18.0, "from": 2.7, "to": "={L1}"},
        ("P5", "P6"),
        '=beam_line("fixed",{L1},"pinned")',
        '=load_line("G: udl",{g},"; Q: udl",{q},"from",{from},"to",{to})',
    ),
    Member(
        "B11",
        "Bow rack arm; cantilever, load at the tip",
        (1.8,),
        210,
        2_700,
        {"g": 1.0, "q": 2.5, "qp": 4.0, "at": "={L1}"},
        ("P9",),
        '="fixed "&{L1}&" free"',
        AREA + '&"; Q: point "&{qp}&" at "&{at}',
        reference="=2*{L1}",
        limit=250,
    ),
    Member(
        "B12",
        "Hoist beam; plated over the middle part",
        (1.5, 3.6, 1.5),
        210,
        9_000,
        {"g": 1.1, "qp": 32.0, "at": "={L1}+{L2}/2"},
        ("P3", "P6"),
        '="pinned "&{L1}&" step "&{L2}&" step "&{L3}&" pinned"',
        '="G: udl "&{g}&"; Q: point "&{qp}&" at "&{at}',
        (16_500, "cm⁴ middle part"),
        "={L1}+{L2}+{L3}",
        500,
        '={E}*{I}/100&" "&{E}*{other}/100&" "&{E}*{I}/100',
    ),
    Member(
        "B13",
        "Roof hip trimmer, glulam; load grows from nothing",
        (5.0,),
        12,
        52_000,
        {"g": 3.2, "q": 4.5},
        ("P1", "P2"),
        '=beam_line("pinned",{L1},"roller")',
        '=load_line("G: varying 0 to",{g},"; Q: varying 0 to",{q})',
    ),
    Member(
        "B14",
        "Davit step beam; a couple from the davit arm",
        (4.5,),
        210,
        3_800,
        {"g": 1.5, "at": 1.5},
        ("P4", "P2"),
        '="pinned "&{L1}&" roller"',
        '="G: udl "&{g}&"; Q: couple "&{other}&" at "&{at}',
        (18, "kNm couple"),
    ),
    Member(
        "B15",
        "Door header; hangers of the sliding door",
        (4.8,),
        210,
        5_400,
        {"g": 1.6, "gp": 14.0, "qp": 22.0, "at": 2.0},
        ("P1", "P2"),
        '="pinned "&{L1}&" roller"',
        '="G: udl "&{g}&' + POINTS,
        limit=500,
    ),
    Member(
        "B16",
        "Roof purlin; two spans and an eaves overhang",
        (5.0, 5.8, 1.2),
        210,
        1_900,
        {"g": 1.1, "q": 3.2},
        ("P1", "P3", "P7"),
        '="pinned "&{L1}&" roller "&{L2}&" roller "&{L3}&" free"',
        AREA,
        reference="=MIN({L1},{L2},2*{L3})",
        limit=200,
    ),
    Member(
        "B17",
        "Sun deck strip, concrete; top face warms, propped",
        (6.5,),
        33,
        90_000,
        {"g": 5.5, "q": 4.0},
        ("P5", "P6"),
        '=beam_line("fixed",{L1},"pinned")',
        '=load_line("T: curvature",{other},"; G: udl",{g},"; Q: udl",{q})',
        (-0.0006, "1/m curvature"),
    ),
    Member(
        "B18",
        "Jetty approach; built in, hinge before the landing",
        (4.0, 3.0),
        210,
        12_500,
        {"g": 3.0, "q": 7.5},
        ("P9", "P7"),
        '="fixed "&{L1}&" hinge "&{L2}&" pinned"',
        AREA,
        reference="={L1}+{L2}",
        limit=250,
    ),
)

# The beam in depth --------------------------------------------------------------------------------

RUNWAY = LaidOut(
    "B19",
    "Boat lift runway beam; three spans, a hinge in the second, built in at the right end",
    ("free", 1.2, "pinned", 6.0, "pinned", 1.5, "hinge", 4.5, "pinned", 5.4, "fixed"),
    (64_000, 64_000, 64_000, 48_000, 48_000),
    (
        # load, size, end size, from, to, at, span, support, case
        ("udl", 3.2, None, None, None, None, None, None, "G"),
        ("udl", 6.5, None, None, None, None, 2, None, "Q"),
        ("varying", 0, 9, 13.2, 18.6, None, None, None, "Q"),
        ("point", 45, None, None, None, 3, 1, None, "Q"),
        ("point", 12, None, None, None, 0, None, None, "Q"),
        ("couple", 10, None, None, None, 2, 3, None, "G"),
        ("settle", "={B9}/1000", None, None, None, None, None, 3, "S"),
    ),
    ("P6", "P7", "P8", "P9"),
)

# The beam that the boat trolley crosses -------------------------------------------------------------

TROLLEY = Crossed(
    "B20",
    "Trolley beam along the quay wall; three unequal spans, overhang over the slipway, crossed by the boat trolley",
    (6.5, 8.0, 5.5, 1.8),
    210,
    48_000,
    6.5,
    9.0,
    (60, 60, 45),
    (1.6, 3.4),
    (("G", "permanent"), ("Q", "storage"), ("T", "variable", 0.7, 0.5, 0.3)),
    "EN 1990 6.10",
    "EN 1990 characteristic",
    "moment at support 2",
    "The recommended factors of the standard stand until others are typed. National annexes and local codes decide on "
    "them, on combinations for equilibrium, and on the trolley's loads. Verify independently.",
)

# The pads: mark, bearing pressure allowed [kN/m²], depth [m] --------------------------------------

PADS = (
    Pad("P1", 150, 0.5),
    Pad("P2", 150, 0.4),
    Pad("P3", 150, 0.5),
    Pad("P4", 125, 0.5),
    Pad("P5", 200, 0.5),
    Pad("P6", 200, 0.5),
    Pad("P7", 125, 0.4),
    Pad("P8", 100, 0.5),
    Pad("P9", 200, 0.5),
    Pad("P10", 100, 0.4),
)

# The words ----------------------------------------------------------------------------------------

FOOTNOTES = (
    (
        "Signs",
        "Loads and deflections downward, reactions upward, sagging moments and clockwise couples are "
        "positive. x runs from the left end of the beam.",
    ),
    (
        "Supports",
        "Numbered from 1, left to right; free ends, hinges and steps are none. The fixing moments of "
        "built-in supports are on sheet Foundations.",
    ),
    (
        "Cases",
        "G permanent, with self weight; Q variable, on all spans at once; S settlement; T temperature. Factors and "
        "combinations are the user's: type them above. “case?” there: a case counts 0, or is none of the four.",
    ),
    (
        "Loads",
        "Pad P8 settles: once, under B9 and B19 alike. The top of B17 warms. The load of B13 grows from 0 at the "
        "left to the value given.",
    ),
    (
        "Deflection",
        "δ max is the largest of the whole beam, up or down. L is the span, or twice the overhang "
        "where that is less; for B8 and B18 the whole length. An error counts as not met.",
    ),
    (
        "Cautions",
        "Linear elastic theory of small deflections. Verify independently; local codes and a licensed "
        "engineer decide. What is left out stands on sheet Notes.",
    ),
)
LOAD_NOTES = (
    "max: G + Q, with S and T where they add; min: G, with Q, S and T where they relieve; Nd: at strength.",
    "Σ|M| adds the fixing moments of all beams and cases without signs: an upper bound. See the sizes.",
    "Q acts on all spans at once. Not counted: pad weight, horizontal loads. Verify before use.",
)
SIZE_NOTES = (
    "Square pad, N max, e = Σ|M| / N: side b from b (b − 2e) = area, rounded up to 0.1 m; by hand where e > b/6.",
    "A negative N min holds the beam down. Blinding, formwork, steel and excavation: not measured.",
)
SIGNS = (
    ("Load, deflection", "positive downward; so is the settlement of a support"),
    ("Reaction", "positive upward"),
    ("Bending moment", "positive when sagging: tension at the bottom"),
    ("Shear force", "positive when the resultant left of the cut acts upward; V = dM/dx"),
    ("Couple, slope", "positive clockwise; so is the fixing moment of a support"),
    ("x", "from the left end of the beam, or of the span where a span is named"),
)
NOTATION = (
    ("Beam line", "marks and lengths in turn, a mark at both ends: fixed 8 pinned, or free 1.5 pinned 6 roller"),
    (
        "Marks",
        "fixed, pinned, roller, guided, free (ends), hinge, step (the stiffness changes), spring(kv), spring(kv, kr)",
    ),
    (
        "Loads line",
        "clauses separated by a semicolon, each [case:] kind size [place]: G: udl 5; Q: point 40 at 1.5 in span 2",
    ),
    (
        "Loads",
        "udl, varying, point, couple, settle (a support), rotate (a support), curvature (imposed, by "
        "warming for example)",
    ),
    (
        "Where adverse",
        "Q: udl 9 each span: on each span by itself; T: axles 60 60 45 spaced 1.6 3.4: a train that moves along the "
        "beam; highest, lowest and governing answer for them",
    ),
    ("Combination", "1.35 G + 1.5 Q + S + T; a case that is not named counts 0"),
    ("Stiffness", "EI = E [GPa] × I [cm⁴] / 100 in kNm²; one number, or one a length"),
    (
        "Decimal comma",
        "where the spreadsheet writes a decimal comma, joining with & puts commas into the text, "
        "which is refused: join with beam_line and load_line instead, as in B4, B9 and B17",
    ),
)
BASIS = (
    (
        "Method",
        "direct stiffness method for straight beams, closed forms between the supports; extremes are "
        "found, not sampled",
    ),
    ("Units", "kN, m, kNm, kNm² throughout the formulas; deflections are shown in mm"),
    (
        "Combinations",
        "strength and characteristic stand once, on sheet Schedule, where the factors read from them are "
        "shown; G, Q, S and T apart on sheet Foundations; on sheet Actions those that a standard makes of the actions",
    ),
)
CAUTIONS = (
    ("Verify", "check every result independently before relying on it; it is as good as its inputs"),
    ("Decide", "local codes and a licensed engineer decide; factors, limits and pressures are examples"),
    ("Settlement, warming", "may relieve as well as load: highest and lowest are given with and without S and T"),
    ("Theory", "linear elastic material, small deflections, plane sections, bending only"),
    (
        "Variable load",
        "acts on all spans at once, except on sheet Actions; look for the least favourable pattern",
    ),
    ("Error values", "a function that cannot answer shows an error value, never a guess; the fault column says why"),
)
LEFT_OUT = (
    ("Forces", "axial force, torsion, biaxial bending, horizontal loads"),
    ("Stability", "buckling of any kind, lateral torsional, local or of the member"),
    ("Time, motion", "creep, shrinkage, cracking, fatigue, vibration, impact; moving loads except on sheet Actions"),
    ("Resistance", "strength of sections, connections, bearings and ground; punching, reinforcement of the pads"),
    ("Self weight", "counted only where it is entered in G"),
    ("Uplift", "the lowest loads of the pads take the load of all spans at once; check what must be held down"),
)
SURVEYOR = (
    ("Pads", "sheet Foundations, table of sizes: side, depth and concrete of each pad"),
    ("By hand", "a pad marked “moment: design by hand” has no size yet, and is in no sum"),
    ("Quay wall", "beam B20 bears on the quay wall and on no pad: its reactions by case are on sheet Actions"),
    ("Changes", "when a span or a load changes, so do the pads: note the revision that was measured"),
)
NOTES = (
    (
        ("Signs, one convention everywhere", SIGNS),
        ("How a beam and its loads are written", NOTATION),
        ("Basis", BASIS),
    ),
    (
        ("Cautions", CAUTIONS),
        ("Left out", LEFT_OUT),
        ("For the quantity surveyor", SURVEYOR),
    ),
)

DESIGN = Design(
    TitleBlock("Kestrel Quay boat store", "KQ-BS", "P2", date(2026, 11, 16), 6),
    MEMBERS,
    RUNWAY,
    TROLLEY,
    PADS,
    "1.35 G + 1.5 Q + S + T",
    "G + Q + S + T",
    FOOTNOTES,
    LOAD_NOTES,
    SIZE_NOTES,
    NOTES,
)

SHEETS = (schedule, understood, in_depth, actions, foundations, notes)


def build() -> Workbook:
    """Return the workbook, its formulas not yet computed."""
    book = Workbook()
    del book[book.sheetnames[0]]
    paper.measure_in_digits_of_the_face(book)
    book.properties.title = f"{DESIGN.issue.project}: beam schedule"
    book.properties.creator = "beamfuncs example"
    # The values of a filled copy are shown as they stand, also where the functions are not installed.
    book.calculation.fullCalcOnLoad = False
    book.calculation.calcId = 191029
    for sheet in SHEETS:
        sheet.draw(book.create_sheet(sheet.NAME), DESIGN)
    return book


def main(arguments: list[str]) -> None:
    """Build the workbook and save it, without macros and with them."""
    target = Path(arguments[0]) if arguments else BOOK
    book = build()
    write(book, target, DESIGN.issue.issued)
    macros.equip(book, DESIGN)
    write(book, target.with_suffix(".xlsm"), DESIGN.issue.issued)
    print(target)
    print(target.with_suffix(".xlsm"))


if __name__ == "__main__":
    main(sys.argv[1:])
