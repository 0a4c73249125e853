"""The report as one page that opens in any browser and prints: no script, nothing fetched, everything escaped."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field
from datetime import date
from typing import TYPE_CHECKING

from beamfuncs.errors import BeamError, ErrorValue
from beamfuncs.hosts.headless.canvas import escaped
from beamfuncs.hosts.headless.drawing import drawing
from beamfuncs.hosts.headless.reporting import error, in_words, reason, single
from beamfuncs.hosts.headless.telling import difference
from beamfuncs.hosts.headless.understanding import Arguments, Reader, Understood

if TYPE_CHECKING:
    from beamfuncs.hosts.headless.filling import ListedCell
    from beamfuncs.hosts.headless.reporting import Listing


MOST_DRAWINGS = 500
"""Of more different beams and combinations the first are drawn."""
MOST_OTHERS = 200
"""Of more cells without a beam that are worth a word the first are told."""
MOST_CELLS = 40
"""Of more cells that use a beam the first are named."""

CAUTIONS = (
    "Verify every result by independent means before anything is sized on it.",
    "Local codes decide which loads, factors and limits apply, and a licensed engineer decides on their use.",
    "Theory: linear elastic, small deflections, straight beams, plane sections. Supports hold in both directions.",
)
SIGNS = (
    "Positive: load and deflection downward, reaction upward, bending moment sagging, shear where the resultant to the"
    " left of the cut acts upward, couple and slope clockwise. Units are those of the workbook."
)
KEY_TO_DRAWINGS = (
    "Arrows show the direction of a load, the number its size. Dashed loads are not in the combination. Supports are"
    " numbered from the left. The moment is drawn on the tension side (sagging below the axis), the shear upward where"
    " positive. A thicker beam is a stiffer one, not to scale."
)

_STYLE = """
:root { color-scheme: light }
body { margin: 2rem auto; max-width: 76rem; padding: 0 1.5rem; background: #fff; color: #1a1a1a;
  font: 14px/1.45 Arial, Helvetica, sans-serif }
h1 { margin: 0 0 .2rem; font-size: 1.7rem } h2 { margin: 2.2rem 0 .6rem; border-bottom: 2px solid #1a1a1a }
h3 { margin: 1.6rem 0 .3rem } p { margin: .3rem 0 }
a { color: #00457a } dl { display: grid; grid-template-columns: max-content 1fr; gap: .1rem 1rem; margin: 1rem 0 }
dt { color: #4a4a4a } dd { margin: 0; font-weight: bold; overflow-wrap: anywhere }
.cautions { border: 2px solid #1a1a1a; padding: .5rem 1rem; margin: 1rem 0 }
table { border-collapse: collapse; width: 100%; table-layout: fixed } thead { display: table-header-group }
th, td { border: 1px solid #8c8c8c; padding: .2rem .5rem; text-align: left; vertical-align: top;
  overflow-wrap: anywhere; unicode-bidi: isolate }
th { background: #e6e6e6 } td p { margin: 0 }
th.cell { width: 9% } th.formula { width: 41% } th.value { width: 20% } tr { break-inside: avoid }
td.number { text-align: right; font-variant-numeric: tabular-nums }
td.error { font-weight: bold } code { font: 12px/1.4 Consolas, Menlo, monospace }
figure { margin: .8rem 0; break-inside: avoid } figcaption { font-weight: bold }
svg { max-width: 100%; height: auto } .together { break-inside: avoid }
@page { margin: 14mm }
@media print { body { margin: 0; max-width: none; padding: 0; font-size: 10pt }
  a { color: inherit; text-decoration: none } h2, h3 { break-after: avoid } }
"""
_HEAD = (
    '<table><thead><tr><th class="cell">Cell</th><th class="formula">Formula</th><th class="value">Value</th>'
    "<th>Understood</th></tr></thead><tbody>"
)


@dataclass
class _Beam:
    """A beam with its loads and stiffness, the cells that ask for its results, and its combinations."""

    number: int
    beam: str
    loads: str
    cells: list[str] = field(default_factory=list)
    combinations: dict[str, Arguments] = field(default_factory=dict)


def page(listing: Listing, today: date, progress: Callable[[int, int], None] = lambda done, of: None) -> str:
    """Return the page that tells of every beam cell."""
    reader = Reader(listing.functions)
    understood = [listing.understood(reader, cell) for cell in listing.cells]
    beams = _Beams(understood)
    rows: dict[str, list[str]] = {}
    for done, (cell, told) in enumerate(zip(listing.cells, understood, strict=True), 1):
        rows.setdefault(cell.sheet, []).append(_row(cell, told, beams))
        progress(done, len(listing.cells))
    title = f"Beam cells of {escaped(listing.source.name)}"
    parts = [
        f"<h1>{title}</h1>",
        *_summary(listing, today, len(beams.all)),
        f'<div class="cautions">{_paragraphs(CAUTIONS)}</div>',
        f"<p>{escaped(SIGNS)}</p>",
        '<h2 id="cells">Cells</h2>',
        *(line for sheet in rows for line in (f"<h3>{escaped(sheet)}</h3>", _HEAD, *rows[sheet], "</tbody></table>")),
        *_others(listing),
        '<h2 id="beams">Beams</h2>',
        f"<p>{escaped(KEY_TO_DRAWINGS)}</p>",
        *_drawn(beams.all),
    ]
    return (
        '<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8">'
        "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'\">"
        '<meta name="viewport" content="width=device-width, initial-scale=1">'
        f"<title>{title}</title><style>{_STYLE}</style></head><body>\n" + "\n".join(parts) + "\n</body></html>\n"
    )


class _Beams:
    """The different beams of a workbook. A call that gives no stiffness asks for the same beam as one that does."""

    def __init__(self, understood: Iterable[Iterable[Understood]]) -> None:
        every = [one for told in understood for one in told if one.solved]
        self._stiff = {(one.line, one.loads): one.beam for one in reversed(every) if one.stiffness_given}
        found: dict[tuple[str, str], _Beam] = {}
        for one in every:
            key = self._key(one)
            beam = found.setdefault(key, _Beam(len(found) + 1, *key))
            known = beam.combinations.get(one.combination)
            if one.arguments and (known is None or (known.stiffness is None and one.stiffness_given)):
                beam.combinations[one.combination] = one.arguments
        self._found = found

    @property
    def all(self) -> list[_Beam]:
        return list(self._found.values())

    def of(self, one: Understood) -> _Beam | None:
        """Return the beam of which a call asks for results."""
        return self._found[self._key(one)] if one.solved else None

    def _key(self, one: Understood) -> tuple[str, str]:
        beam = one.beam if one.stiffness_given else self._stiff.get((one.line, one.loads), one.beam)
        return beam, one.loads


def _summary(listing: Listing, today: date, beams: int) -> Iterator[str]:
    failing = sum(bool(cell.faults) for cell in listing.cells)
    facts = [
        ("Workbook", listing.source.name),
        ("Values stored in", listing.done.target.name),
        ("Date", today.isoformat()),
        ("Beam formulas", str(len(listing.cells))),
        ("of them in error", str(failing)),
        ("Other formulas", str(listing.done.recomputed)),
        ("Stored otherwise than computed", str(len(listing.done.differences))),
        ("Different beams", str(beams)),
    ]
    yield "<dl>" + "".join(f"<dt>{name}</dt><dd>{escaped(fact)}</dd>" for name, fact in facts) + "</dl>"


def _others(listing: Listing) -> Iterator[str]:
    """Yield lists of the other cells in error and of those whose stored value is not the computed one."""
    of_beams = {(fault.sheet, fault.cell) for cell in listing.cells for fault in cell.faults}
    errors = [
        f"{fault.sheet}!{fault.cell}: {fault.value}: {fault.reason}"
        for fault in listing.done.errors
        if (fault.sheet, fault.cell) not in of_beams
    ]
    differences = [f"{one.sheet}!{one.cell}: {difference(one)}" for one in listing.done.differences]
    for title, told in (("Other cells in error", errors), ("Stored otherwise than computed", differences)):
        if told:
            more = [f"and {len(told) - MOST_OTHERS} more"] if len(told) > MOST_OTHERS else []
            yield f"<h2>{title}</h2>{_paragraphs([*told[:MOST_OTHERS], *more])}"


def _row(cell: ListedCell, understood: list[Understood], beams: _Beams) -> str:
    name = f"{cell.sheet}!{cell.cells}"
    value = cell.values[0][0]
    if not single(cell):
        kind, shown = ("error" if cell.faults else ""), in_words(cell)
    elif isinstance(value, ErrorValue):
        kind, shown = "error", error(cell)
    elif isinstance(value, bool) or not isinstance(value, float):
        kind, shown = "", str(value).upper() if isinstance(value, bool) else str(value)
    else:
        kind, shown = "number", f"{value:.10g}"
    if cell.faults:
        shown = f"{shown}: {reason(cell)}"
    told = []
    for one in understood:
        beam = beams.of(one)
        if beam is None:
            told += [_paragraphs(text for text in (one.beam, one.loads) if text not in ("", shown))]
        else:
            told.append(f'<p><a href="#beam-{beam.number}">Beam {beam.number}</a>, {escaped(one.combination)}</p>')
            if name not in beam.cells[-1:]:
                beam.cells.append(name)
    return (
        f"<tr><td>{escaped(cell.cells)}</td><td><code>{escaped(cell.formula)}</code></td>"
        f'<td class="{kind}">{escaped(shown)}</td><td>{"".join(told)}</td></tr>'
    )


def _drawn(beams: Iterable[_Beam]) -> Iterator[str]:
    left = MOST_DRAWINGS
    for beam in beams:
        figures = [_figure(*one) for one in list(beam.combinations.items())[: max(left, 0)]]
        left -= len(beam.combinations)
        more = f" and {len(beam.cells) - MOST_CELLS} more" if len(beam.cells) > MOST_CELLS else ""
        told = [beam.beam, beam.loads, f"Cells: {', '.join(beam.cells[:MOST_CELLS])}{more}"]
        yield f'<section id="beam-{beam.number}"><div class="together"><h3>Beam {beam.number}</h3>{_paragraphs(told)}'
        yield f"{''.join(figures[:1])}</div>{''.join(figures[1:])}</section>"
    if left < 0:
        yield f"<p>{-left} more drawings are left out: the first {MOST_DRAWINGS} are drawn.</p>"


def _figure(combination: str, arguments: Arguments) -> str:
    try:
        picture = drawing(arguments.beam, arguments.loads, arguments.stiffness, arguments.combination)
    except BeamError as refusal:
        picture = f"<p>Not drawn: {escaped(refusal.reason)}</p>"
    return f"<figure><figcaption>{escaped(combination)}</figcaption>{picture}</figure>"


def _paragraphs(texts: Iterable[str]) -> str:
    return "".join(f"<p>{escaped(text)}</p>" for text in texts)
