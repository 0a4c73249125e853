"""The notation: cell values to beams, loads and combinations, and back to canonical text."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import lru_cache
from math import inf

from beamfuncs.beam import MARK_ALIASES, MARK_KINDS, Beam, Mark, Stiffness, check_size
from beamfuncs.cells import (
    NUMBER,
    Cell,
    Frozen,
    as_text,
    decimal_comma,
    flat,
    is_number,
    not_given,
    number,
    rows_of,
    whole,
)
from beamfuncs.errors import BeamError, impossible, quoted, unreadable
from beamfuncs.loads import EACH, LOAD_ALIASES, LOAD_KINDS, Axles, Clause, Combination, Load, Loads

CACHED = 20_480
"""How many readings of each kind are kept: beams, loads, combinations."""

_EXAMPLE = "e.g. 'fixed 8 pinned'"
_BEAM_WORD = re.compile(r"spring\s*\([^()]*\)|\S+", re.IGNORECASE)
_SPRING = re.compile(r"spring\s*\((.*)\)", re.IGNORECASE | re.DOTALL)
CASE = r"[^\W\d_]\w*"
"""The name of a load case."""
_CASE_PREFIX = re.compile(rf"\s*({CASE})\s*:(.*)", re.DOTALL)
_CLAUSE_END = re.compile(r"[;\n\r\v\f\x85\u2028\u2029]")
_TERM = re.compile(
    rf"\s*(?P<sign>[+-]?)\s*(?:(?P<factor>{NUMBER})(?:\s*/\s*(?P<favourable>{NUMBER}))?\s*\*?)?\s*(?P<case>{CASE})?"
)


# --- the beam -------------------------------------------------------------------------------------


@lru_cache(CACHED, typed=True)
def read_line(beam: Frozen) -> Beam:
    """Return the beam that a text or a range of marks and lengths describes, without its stiffness.

    >>> read_line("fixed 8 pin").lengths
    (8.0,)
    """
    marks: list[Mark] = []
    lengths: list[float] = []
    for part in _beam_parts(beam):
        if isinstance(part, Mark):
            if len(marks) > len(lengths):
                raise unreadable(
                    f"beam: mark '{part.kind}' follows mark '{marks[-1].kind}' without a length between; {_EXAMPLE}"
                )
            marks.append(part)
        else:
            if len(marks) == len(lengths):
                before = f"length {lengths[-1]:.12g} without a mark between" if lengths else "nothing"
                raise unreadable(f"beam: length {part:.12g} follows {before}; a line starts with a mark, {_EXAMPLE}")
            lengths.append(part)
    if not marks:
        raise unreadable(f"beam: blank; write a line of marks and lengths, {_EXAMPLE}")
    if not lengths:
        raise unreadable(f"beam: '{marks[0].kind}' alone; write a line of marks and lengths, {_EXAMPLE}")
    if len(marks) == len(lengths):
        raise unreadable(f"beam: ends with the length {lengths[-1]:.12g}; a line ends with a mark, {_EXAMPLE}")
    return Beam(tuple(marks), tuple(lengths))


@lru_cache(CACHED, typed=True)
def read_beam(beam: Frozen, stiffness: Frozen) -> Beam:
    """Return the beam with its stiffness, where one is given.

    >>> read_beam("fixed 8 pinned", 24000.0).stiffness
    Stiffness(EI=(24000.0,), GA=None)
    """
    line = read_line(beam)
    return Beam(line.marks, line.lengths, _stiffness(stiffness, len(line.lengths)))


def _beam_parts(beam: Frozen) -> Iterator[Mark | float]:
    if isinstance(beam, float | int):
        raise unreadable(f"beam: the number {beam:g}; a beam is a line of marks and lengths, {_EXAMPLE}")
    in_range = isinstance(beam, tuple)
    for cell in flat(beam):
        if cell is None:
            continue
        if not isinstance(cell, str):
            yield cell
            continue
        words = _BEAM_WORD.findall(cell)
        if in_range and len(words) > 1:
            raise unreadable(
                f"beam: cell {quoted(cell)} of the range holds {len(words)} words; one mark or length a cell"
            )
        yield from map(_beam_part, words)


def _beam_part(word: str) -> Mark | float:
    name = word.lower()
    name = MARK_ALIASES.get(name, name)
    if name in MARK_KINDS and name != "spring":
        return Mark.of(name)
    spring = _SPRING.fullmatch(word)
    if spring:
        return _spring(word, spring[1])
    if name.startswith("spring"):
        raise unreadable(f"beam: {quoted(word)} needs its stiffness, e.g. 'spring(2500)' or 'spring(2500, 800)'")
    if is_number(word):
        return number("beam", word)
    if re.search(r"[0-9],[0-9]", word):
        raise decimal_comma("beam", word)
    if word.endswith(","):
        raise unreadable(
            f"beam: {quoted(word, 30)} ends with a comma; marks and lengths are parted by blanks, {_EXAMPLE}"
        )
    raise unreadable(f"beam: {quoted(word, 30)} is neither a length nor a mark ({', '.join(MARK_KINDS)}); {_EXAMPLE}")


def _spring(word: str, inside: str) -> Mark:
    # A comma without a blank after it may be a decimal comma, so it is not guessed at.
    sizes = re.split(r",\s+|;", inside.strip())
    if "," in "".join(sizes):
        raise unreadable(
            f"beam: {quoted(word)}: write a blank after the comma between kv and kr, and decimals with a point,"
            " e.g. 'spring(2500, 800)'"
        )
    if len(sizes) > 2:
        raise unreadable(f"beam: {quoted(word)} has {len(sizes)} numbers; a spring has kv, or kv and kr")
    kv, *kr = (number(f"beam, {quoted(word)}", size.strip() or None, "a spring stiffness") for size in sizes)
    return Mark.spring(kv, *kr)


def beam_text(beam: Beam) -> str:
    """Return the canonical text of a beam line.

    >>> beam_text(read_line("FIX 8.0 Pin 2 spring(100)"))
    'fixed 8 pinned 2 spring(100)'
    """
    words = [_mark_text(beam.marks[0])]
    for length, mark in zip(beam.lengths, beam.marks[1:], strict=True):
        words += [as_text(length), _mark_text(mark)]
    return " ".join(words)


def _mark_text(mark: Mark) -> str:
    if mark.kind != "spring":
        return mark.kind
    return f"spring({as_text(mark.kv)}, {as_text(mark.kr)})" if mark.kr else f"spring({as_text(mark.kv)})"


# --- the stiffness --------------------------------------------------------------------------------

STIFFNESS_TERMS = ("EI", "GA")
_THOUSANDS = re.compile(r"(?<![\w.])[0-9]{1,3}(?:\s[0-9]{3})+(?![\w.])")


def _stiffness(stiffness: Frozen, lengths: int) -> Stiffness | None:
    if all(not_given(cell) for cell in flat(stiffness)):
        return None
    terms: dict[str, list[float]] = {}
    term = "EI"
    for word in _stiffness_words(stiffness):
        name = word.upper() if isinstance(word, str) else ""
        if name in STIFFNESS_TERMS:
            if name in terms:
                raise unreadable(f"stiffness: {name} is given twice; give each term once, e.g. 'EI 24000; GA 5e5'")
            term = name
            terms[term] = []
        else:
            size = number("stiffness", word, _wanted_stiffness(stiffness))
            check_size(f"stiffness: {term}", size)
            terms.setdefault(term, []).append(size)
    for name, sizes in terms.items():
        if len(sizes) not in (1, lengths):
            raise unreadable(
                f"stiffness: {len(sizes)} values of {name} for {lengths} lengths; give one, or one for each length"
            )
    cells = [cell for cell in flat(stiffness) if cell is not None]
    if isinstance(stiffness, tuple) and lengths > 1 and len(cells) == 1 and not isinstance(cells[0], str):
        raise unreadable(
            f"stiffness: one value and blanks for {lengths} lengths; give one cell, or one value for each length"
        )
    if "EI" not in terms:
        raise unreadable("stiffness: has no EI; give it too, e.g. 'EI 24000; GA 5e5'")
    values = {name: tuple(sizes * lengths if len(sizes) == 1 else sizes) for name, sizes in terms.items()}
    return Stiffness(values["EI"], values.get("GA"))


def _wanted_stiffness(stiffness: Frozen) -> str:
    wanted = f"a number or a term ({', '.join(STIFFNESS_TERMS)})"
    if isinstance(stiffness, str) and "+" in stiffness:
        wanted += "; if this is the combination, leave the stiffness before it blank"
    return wanted


def may_be_thousands(text: str) -> bool:
    """Tell whether a text holds what may be one number with a blank in it, or several: `24 500`."""
    return _THOUSANDS.search(text) is not None


def _stiffness_words(stiffness: Frozen) -> Iterator[str | float]:
    for cell in flat(stiffness):
        if isinstance(cell, str):
            if may_be_thousands(cell):
                raise unreadable(
                    f"stiffness: {quoted(cell)} may be one number with a blank in it, or several; write 24500 without a"
                    " blank, or 24. 500. for two"
                )
            yield from cell.replace(";", " ").replace("=", " ").split()
        elif cell is not None:
            yield cell


# --- the loads ------------------------------------------------------------------------------------


@lru_cache(CACHED, typed=True)
def read_clauses(loads: Frozen) -> tuple[Clause | Axles, ...]:
    """Return the clauses that a text, a range of texts or a table describes.

    >>> [clause.kind for clause in read_clauses("G: udl 5; Q: point 40 at 3")]
    ['udl', 'point']
    """
    if isinstance(loads, float | int):
        raise unreadable(f"loads: the number {loads:g}; write a load such as 'udl {loads:g}' or 'point 40 at 3'")
    header = _header(loads)
    clauses = tuple(_table_clauses(loads, header) if header else _text_clauses(loads))
    if not clauses:
        raise unreadable("loads: blank; write the loads, e.g. 'udl 12', or 'udl 0' for an unloaded beam")
    return _one_spelling(clauses)


@lru_cache(CACHED, typed=True)
def read_loads(loads: Frozen, beam: Beam) -> Loads:
    """Return the loads placed on a beam."""
    return _placed(read_clauses(loads), beam)


def read_anew(beam: Frozen, loads: Frozen, stiffness: Frozen) -> tuple[Beam, Loads]:
    """Return a beam and its loads without keeping them: for one of very many trials."""
    stiff = read_anew_beam(beam, stiffness)
    return stiff, _placed(read_clauses.__wrapped__(loads), stiff)


def read_anew_beam(beam: Frozen, stiffness: Frozen) -> Beam:
    """Return a beam with its stiffness without keeping it."""
    line = read_line.__wrapped__(beam)
    return Beam(line.marks, line.lengths, _stiffness(stiffness, len(line.lengths)))


def _placed(clauses: tuple[Clause | Axles, ...], beam: Beam) -> Loads:
    placed: list[Load] = []
    part = 0
    for clause in clauses:
        if isinstance(clause, Clause):
            for load in clause.on(beam):
                if clause.each:
                    part += 1
                placed.append(replace(load, part=part) if clause.each else load)
    return Loads(tuple(placed), tuple(clause.train for clause in clauses if isinstance(clause, Axles)))


def _one_spelling(clauses: tuple[Clause | Axles, ...]) -> tuple[Clause | Axles, ...]:
    """Return the clauses with each case spelled as where it is first written: `g` and `G` are one case."""
    spelling: dict[str, str] = {}
    for clause in clauses:
        if clause.case is not None:
            spelling.setdefault(clause.case.casefold(), clause.case)
    return tuple(_renamed(clause, spelling) for clause in clauses)


def _renamed(clause: Clause | Axles, spelling: dict[str, str]) -> Clause | Axles:
    if clause.case is None or spelling[clause.case.casefold()] == clause.case:
        return clause
    return replace(clause, case=spelling[clause.case.casefold()])


def _text_clauses(loads: Frozen) -> Iterator[Clause | Axles]:
    count = 0
    for cell in flat(loads):
        if cell is None:
            continue
        if not isinstance(cell, str):
            raise unreadable(
                f"loads: the number {cell:g} stands among texts; write e.g. 'udl {cell:g}', or a table with headers"
            )
        for text in _CLAUSE_END.split(cell):
            if not text.isspace() and text:
                count += 1
                yield _clause(f"loads, clause {count}", text)


def _clause(where: str, text: str) -> Clause | Axles:
    prefix = _CASE_PREFIX.fullmatch(text)
    case, rest = (prefix[1], prefix[2]) if prefix else (None, text)
    if ":" in rest:
        raise unreadable(f"{where}: {quoted(text)}: a case is a letter and then letters, digits or _, e.g. 'G: udl 5'")
    words = _Words(where, text, rest.split())
    if words.take("axles"):
        return _axles(words, case)
    kind = _load_kind(where, words.next("a load"))
    size = words.number(f"the size, e.g. '{LOAD_KINDS[kind].example}'")
    parts: dict[str, float | int | str] = {}

    def put(name: str, value: float | int | str) -> None:
        if name in parts:
            raise unreadable(f"{where}: {quoted(text)} gives a place twice; write e.g. '{LOAD_KINDS[kind].example}'")
        parts[name] = value

    if "end_size" in LOAD_KINDS[kind].takes and words.take("to"):
        put("end_size", words.number())
    while words.left:
        if words.take("from"):
            put("start", words.number())
            if words.take("to"):
                put("end", words.number())
        elif words.take("at", "support"):
            put("support", words.whole("a support number"))
        elif words.take("at"):
            put("at", words.number())
        elif words.take("in", "span"):
            put("span", words.whole("a span number"))
        elif each := next((each for each in EACH if words.take("each", each)), None):
            put("each", each)
        else:
            raise unreadable(
                f"{where}: {quoted(words.left[0], 30)} in {quoted(text)} is not understood;"
                f" write e.g. '{LOAD_KINDS[kind].example}'"
            )
    return Clause(where, kind, size, case=case, **parts)  # type: ignore[arg-type]


def _axles(words: _Words, case: str | None) -> Axles:
    axles = words.numbers("the load of an axle")
    spacings = words.numbers("a distance between axles") if words.take("spaced") else []
    both_ways, lane = False, None
    while words.left:
        if not both_ways and words.take("both", "ways"):
            both_ways = True
        elif lane is None and words.take("lane", "udl"):
            lane = words.number("the load of the lane")
        else:
            raise unreadable(
                f"{words.where}: {quoted(words.left[0], 30)} in {quoted(words.text)} is not understood; write e.g."
                f" '{Axles.example} both ways lane udl 9'"
            )
    return Axles(words.where, tuple(axles), tuple(spacings), both_ways, lane or 0.0, case)


def _load_kind(where: str, word: str) -> str:
    name = word.lower()
    name = LOAD_ALIASES.get(name, name)
    if name not in LOAD_KINDS:
        raise unreadable(f"{where}: {quoted(word, 30)} is not a load; a load is one of {', '.join(LOAD_KINDS)}, axles")
    return name


PLACE_WORDS = ("from", "to", "at", "in", "span", "support")


class _Words:
    """The words of a clause, taken from the left."""

    def __init__(self, where: str, text: str, words: list[str]) -> None:
        self.where = where
        self.text = text
        self.left = words

    def next(self, wanted: str) -> str:
        if not self.left:
            raise unreadable(f"{self.where}: {quoted(self.text)} ends where {wanted} is due")
        return self.left.pop(0)

    def take(self, *words: str) -> bool:
        """Take these words if they come next."""
        if [word.lower() for word in self.left[: len(words)]] != list(words):
            return False
        del self.left[: len(words)]
        return True

    def number(self, wanted: str = "a number") -> float:
        word = self.next(wanted)
        if word.lower() in PLACE_WORDS:
            raise unreadable(f"{self.where}: '{word}' in {quoted(self.text)} stands where {wanted} is due")
        if word.endswith(","):
            raise unreadable(f"{self.where}: {quoted(word)} ends with a comma; clauses are parted by ';'")
        return number(self.where, word)

    def numbers(self, wanted: str) -> list[float]:
        """Take all numbers that come next, one at least."""
        taken = [self.number(wanted)]
        while self.left and is_number(self.left[0]):
            taken.append(self.number())
        return taken

    def whole(self, wanted: str) -> int:
        return whole(self.where, self.next(wanted), wanted)


def clause_text(clause: Clause | Axles) -> str:
    """Return the canonical text of a clause.

    >>> [clause_text(clause) for clause in read_clauses("g:UNIFORM 12.0 from 2 to 6; AXLES 80 40 spaced 1.20")]
    ['g: udl 12 from 2 to 6', 'axles 80 40 spaced 1.2']
    """
    words = _axles_words(clause) if isinstance(clause, Axles) else _clause_words(clause)
    return " ".join(words if clause.case is None else [f"{clause.case}:", *words])


def _axles_words(clause: Axles) -> list[str]:
    words = ["axles", *map(as_text, clause.axles)]
    if clause.spacings:
        words += ["spaced", *map(as_text, clause.spacings)]
    if clause.both_ways:
        words += ["both ways"]
    return [*words, "lane udl", as_text(clause.lane)] if clause.lane else words


def _clause_words(clause: Clause) -> list[str]:
    words = [clause.kind, as_text(clause.size)]
    for word, value in (
        ("to", clause.end_size),
        ("from", clause.start),
        ("to", clause.end),
        ("at", clause.at),
        ("at support", clause.support),
        ("in span", clause.span),
    ):
        if value is not None:
            words += [word, as_text(value)]
    return [*words, "each", clause.each] if clause.each else words


# --- the load table -------------------------------------------------------------------------------


def _each(where: str, cell: Cell) -> str:
    word = cell.strip().lower() if isinstance(cell, str) else cell
    if word not in EACH:
        raise unreadable(f"{where}: {quoted(cell)}; write {' or '.join(EACH)}, or leave it blank")
    return str(word)


HEADERS: dict[str, tuple[str, Callable[[str, Cell], object]]] = {
    "size": ("size", number),
    "end size": ("end_size", number),
    "from": ("start", number),
    "to": ("end", number),
    "at": ("at", number),
    "span": ("span", whole),
    "support": ("support", whole),
    "each": ("each", _each),
}
"""The headers of a load table beside `load` and `case`, the part of a clause that each gives, and how it is read."""


def is_load_table(loads: Frozen) -> bool:
    """Tell whether a range is a load table: its first row that holds text has the header `load`."""
    return _header(loads) is not None


def _header(loads: Frozen) -> dict[int, str] | None:
    """Return the header of each column of a load table, or None where the range is no table."""
    for row in rows_of(loads):
        words = {c: " ".join(cell.lower().split()) for c, cell in enumerate(row) if isinstance(cell, str)}
        if words:
            return words if "load" in words.values() else None
    return None


def _table_clauses(loads: Frozen, header: dict[int, str]) -> Iterator[Clause]:
    known = ("load", "case", *HEADERS)
    for word in header.values():
        if word not in known:
            raise unreadable(f"loads: header {quoted(word, 30)} is not known; headers are {', '.join(known)}")
        if list(header.values()).count(word) > 1:
            raise unreadable(f"loads: header '{word}' stands twice; each header stands once")
    started = False
    for number_, row in enumerate(rows_of(loads), 1):
        if all(cell is None for cell in row):
            continue
        if started:
            yield _table_clause(f"loads, row {number_}", row, header)
        started = True


def _table_clause(where: str, row: tuple[Cell, ...], header: dict[int, str]) -> Clause:
    cells = {word: row[column] for column, word in header.items()}
    for column, cell in enumerate(row):
        if column not in header and cell is not None:
            raise unreadable(f"{where}: {quoted(cell)} stands in column {column + 1}, which has no header")
    load, case = cells.get("load"), cells.get("case")
    if not isinstance(load, str):
        raise unreadable(f"{where}: no load; its first word is one of {', '.join(LOAD_KINDS)}")
    if cells.get("size") is None:
        raise unreadable(f"{where}: no size; write 0 for none")
    if case is not None and not (isinstance(case, str) and re.fullmatch(CASE, case.strip())):
        raise unreadable(f"{where}: case {quoted(case)}; a case is a letter and then letters, digits or _")
    parts = {
        name: read(f"{where}, {word}", cells[word])
        for word, (name, read) in HEADERS.items()
        if cells.get(word) is not None
    }
    name = case.strip() if isinstance(case, str) else None
    return Clause(where, _load_kind(where, load.strip()), case=name, **parts)  # type: ignore[arg-type]


# --- the combination ------------------------------------------------------------------------------


@lru_cache(CACHED, typed=True)
def read_combination(combination: Frozen) -> Combination | None:
    """Return the factor of each case that a combination names, or None where it is blank.

    >>> read_combination("1.35/1.0 G + 1.5 Q")
    (('g', 1.35, 1.0), ('q', 1.5, None))
    """
    if not_given(combination):
        return None
    if not isinstance(combination, str):
        what = "a range" if isinstance(combination, tuple) else f"the number {combination:g}"
        raise unreadable(f"combination: {what}; write one text such as '1.35 G + 1.5 Q'")
    factors: dict[str, tuple[float, float | None]] = {}
    text = combination.strip()
    position = 0
    while position < len(text):
        term = _TERM.match(text, position)
        if term is None or term["case"] is None or (position > 0 and not term["sign"]):
            raise _not_a_combination(text, position)
        sign = -1.0 if term["sign"] == "-" else 1.0
        factor = sign * (number("combination", term["factor"]) if term["factor"] else 1.0)
        favourable = sign * number("combination", term["favourable"]) if term["favourable"] else None
        name = term["case"].casefold()
        before, two_before = factors.get(name, (0.0, None))
        if name in factors and not (two_before is None and favourable is None):
            raise unreadable(f"combination: {quoted(text)} names {term['case']} twice, with two factors; name it once")
        factors[name] = before + factor, favourable
        position = term.end()
        while position < len(text) and text[position].isspace():
            position += 1
    if not all(abs(factor) < inf for factor, _ in factors.values()):
        raise impossible("combination: the factors of a case add up to more than a number can hold")
    return tuple((name, *of_case) for name, of_case in factors.items())


EVERY_LOAD_ONCE = "every load once"


@lru_cache(CACHED, typed=True)
def read_combinations(combinations: Frozen) -> tuple[tuple[str, Combination | None], ...]:
    """Return each combination of a range with its text, blanks skipped; every load once where all is blank.

    >>> [text for text, _ in read_combinations((("1.35 G",), (None,), ("G + Q",)))]
    ['1.35 G', 'G + Q']
    """
    if isinstance(combinations, tuple):
        texts = [cell for cell in flat(combinations) if not not_given(cell)]
    else:
        texts = [] if not_given(combinations) else [combinations]
    found = tuple((str(text).strip(), read_combination(text)) for text in texts)
    return found or ((EVERY_LOAD_ONCE, None),)


def _not_a_combination(text: str, position: int) -> BeamError:
    rest = text[position:]
    if re.match(r"\s*[+-]?\s*[0-9]*,[0-9]", rest):
        return decimal_comma("combination", rest.split()[0] if rest.split() else rest)
    return unreadable(
        f"combination: {quoted(text)} is not understood at {quoted(rest, 20)}; write e.g. '1.35 G + 1.5 Q'"
    )
