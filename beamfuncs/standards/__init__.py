"""Combinations of actions as standards list them: a module for each standard, and the worksheet function over them."""

from __future__ import annotations

import re
from typing import TypeAlias

from beamfuncs.cells import Argument, as_text, frozen
from beamfuncs.documentation import worksheet_function
from beamfuncs.errors import BeamError, quoted, unreadable
from beamfuncs.standards import asce_7, en_1990
from beamfuncs.standards.actions import read_actions
from beamfuncs.standards.listing import listed

Texts: TypeAlias = list[list[str]]
"""An array of texts: rows of cells."""


@worksheet_function
def combinations(standard: Argument, actions: Argument, leading: Argument = None, factors: Argument = None) -> Texts:
    """Return the combinations that a standard makes of actions, a text a row; national annexes and local codes decide.

    Parameters
    ----------
    standard
        'EN 1990 6.10', '6.10a/b', '6.10a', '6.10b', 'EQU', 'set C', 'characteristic', 'frequent', 'quasi-permanent';
        'ASCE 7-22 strength', 'ASCE 7-22 allowable', or 7-16.
    actions
        Rows: case, action, own psi0, psi1, psi2 (blank: table A1.1); or text 'G permanent; Q office; S snow; W1 or W2
        wind'. Or category A to H, temperature, variable. ASCE: D, L, Lr, S, R, W, WT, E, Ev.
    leading
        EN 1990: the case of the variable action that leads. Blank: each leads in turn.
    factors
        EN 1990, where others than the recommended ones hold: 'G 1.35/1.0; Q 1.5; xi 0.85', or rows G, adverse,
        favourable; Q, factor; xi, factor. Blank: recommended.

    Returns
    -------
    A column of texts such as '1.35 G + 1.5 Q + 0.9 W', each once, which every function takes as its combination. Every
    permanent action stands with its adverse and with its favourable factor, every variable one is present or absent; a
    factor of 0 leaves its case out.

    Raises
    ------
    BeamError
        `#VALUE!` where an argument cannot be read or is missing, `#NUM!` where a factor is out of range or there are
        more than 10,000 combinations, `#N/A` where no combination is left or no variable action is the leading one.

    Notes
    -----
    National annexes and local codes decide: the factors are the recommended ones of the standard itself; give those
    that the annex in force changes. A list of your own is a range of such texts.

    A row is one action. Cases that act together are joined, 'G1 + G2 permanent' (one source: EN 1990 table A1.2(B)
    note 3); of cases that exclude each other (EN 1990 A1.2.1(1)) one acts at a time, 'W1 or W2 wind'; '-T' turns a case
    round, 'T or -T temperature'. Imposed loads of one category in several rows are one action, any of whose parts act
    (EN 1991-1-1 3.3.1(2)P); those of different categories lead in turn.

    EN 1990:2002+A1:2005, buildings. (6.10), and (6.10a) with (6.10b), of 6.4.3.2 with set B, table A1.2(B); EQU is
    (6.10) with set A, table A1.2(A); set C is (6.10) with table A1.2(C). Characteristic (6.14b), frequent (6.15b) and
    quasi-permanent (6.16b) have factors of 1 (table A1.4). psi of table A1.1: snow is that at 1000 m or less, and 'snow
    above 1000 m', 'snow in Finland' (Iceland, Norway, Sweden) take the others. In (6.10b) 0.85 times 1.35 is listed as
    1.1475, which table A1.2(B) rounds to 1.15. With a leading action given only the combinations that it leads are
    listed; (6.10a) and quasi-permanent know none. Roofs (category H) are combined with snow and wind too, which
    EN 1991-1-1 3.3.2(1) does not ask for.
    Left out: accidental (6.11), seismic (6.12), fatigue, prestress, bridges (annex A2), EQU and STR verified at once
    (note 2 to table A1.2(A)), (6.10a) with permanent actions alone, KFI (table B3).

    ASCE/SEI 7-22 and 7-16: strength 2.3.1 and 2.3.6, allowable stress 2.4.1 and 2.4.5. D dead, L live, Lr roof live, S
    snow, R rain, W wind, WT tornado (7-22), E or Eh earthquake, which acts in both directions (12.5.1), Ev its vertical
    part; what an action is may be left blank where the case has the letter for its name. The load that a combination is
    written for acts, its others act or not; what is not listed lies between combinations that are.
    Left out: the smaller factor that exceptions allow for L (2.3.1, 2.3.6), F, H, T, flood, ice, overstrength.

    Examples
    --------
    >>> for [text] in combinations("EN 1990 6.10", "G permanent; Q office; W wind", "Q"):
    ...     print(text)
    1.35 G + 1.5 Q
    1.35 G + 1.5 Q + 0.9 W
    G + 1.5 Q
    G + 1.5 Q + 0.9 W
    >>> combinations("ASCE 7-22 allowable", [["D"], ["L"], ["S"]])
    [['D'], ['D + L'], ['D + 0.7 S'], ['D + 0.75 L + 0.525 S'], ['0.6 D']]
    """
    name = _standard(frozen("standard", standard))
    lead, given = frozen("leading", leading), frozen("factors", factors)
    rows = read_actions(frozen("actions", actions))
    if name in asce_7.LISTS:
        found = asce_7.combined(name, rows, lead, given)
    else:
        found = en_1990.combined(name, rows, lead, given)
    return [[text] for text in listed(found)]


_EN_1990 = re.compile(r"(?:en ?1990(?:[-: ]?2002(?: ?\+ ?a1(?:: ?2005)?)?)?[, ]*)?(.+)")
_ASCE_7 = re.compile(r"asce(?:/sei)? ?7-(\d\d),? (.+)")
_JOINED = re.compile(r" ?(?:[/,;&+]| and | with ) ?")


def _standard(cell: object) -> str:
    """Return the name of a list as its standard's module has it."""
    if isinstance(cell, float):
        cell = as_text(cell)
    if not isinstance(cell, str):
        read = "a range" if cell else "blank"
        raise unreadable(f"standard: {read}; {_WANTED}")
    text = " ".join(cell.lower().split())
    if asce := _ASCE_7.fullmatch(text):
        name = f"7-{asce[1]} {asce_7.METHODS.get(asce[2], '')}"
        if name in asce_7.LISTS:
            return name
    elif en := _EN_1990.fullmatch(text):
        name = _JOINED.sub("/", en[1].replace("(", "").replace(")", "").replace("-", " "))
        if name in en_1990.NAMES:
            return en_1990.NAMES[name]
    raise _unknown(cell, text)


_WANTED = "give e.g. 'EN 1990 6.10' or 'ASCE 7-22 strength'"


def _unknown(cell: str, text: str) -> BeamError:
    if "asce" in text:
        return unreadable(
            f"standard: {quoted(cell, 40)} is not known; with ASCE give the edition and strength or allowable, e.g."
            " 'ASCE 7-22 strength', 'ASCE 7-16 allowable'"
        )
    return unreadable(
        f"standard: {quoted(cell, 40)} is not known; of EN 1990 there are {', '.join(en_1990.EXPRESSIONS)};"
        " of others 'ASCE 7-22 strength', 'ASCE 7-22 allowable' and 7-16"
    )
