"""The VBA module of the add-in: read by a grammar of VBA, and compared with the catalogue in both directions."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from typing import Any

import antlr4
import pytest
from antlr4.error.ErrorListener import ErrorListener
from antlr4_vba.vbaLexer import vbaLexer
from antlr4_vba.vbaParser import vbaParser
from oletools.olevba import VBA_Parser

from beamfuncs.catalogue import Entry, catalogue
from beamfuncs.hosts.excel_addin import vba
from beamfuncs.hosts.excel_addin.templates import template

ENTRIES = list(catalogue().values())
by_name = pytest.mark.parametrize("entry", ENTRIES, ids=[entry.name for entry in ENTRIES])

LONGEST_LINE = 1023
MOST_CONTINUATIONS = 24
MOST_ARGUMENTS = 60
LONGEST_HELP = 255
LONGEST_NAME = 255
TEXT = vba.module_text()
LINES = TEXT.replace("\r\n", "\n").split("\n")
LOGICAL = re.sub(r" _\n\s*", " ", "\n".join(LINES)).split("\n")
"""The statements, a continued one in one line."""


@dataclass(frozen=True)
class Declared:
    """A procedure as the module declares it: its arguments by name, each plain, `Optional` or `ParamArray`."""

    name: str
    kind: str
    public: bool
    arguments: tuple[tuple[str, str], ...]


class _Faults(ErrorListener):  # type: ignore[misc]
    def __init__(self) -> None:
        self.found: list[str] = []

    def syntaxError(self, recognizer: Any, symbol: Any, line: int, column: int, message: str, error: Any) -> None:
        self.found.append(f"line {line}, column {column}: {message}")


def parsed(text: str) -> tuple[Any, list[str]]:
    """The tree of a module, and what the grammar finds wrong with it."""
    faults = _Faults()
    lexer = vbaLexer(antlr4.InputStream(text))
    parser = vbaParser(antlr4.CommonTokenStream(lexer))
    for one in (lexer, parser):
        one.removeErrorListeners()
        one.addErrorListener(faults)
    return parser.startRule(), faults.found


@cache
def module() -> tuple[Any, list[str]]:
    """The module's tree and faults."""
    return parsed(TEXT)


def inside(tree: Any, kind: type) -> Iterator[Any]:
    """The parts of one kind in a tree."""
    if isinstance(tree, kind):
        yield tree
    for child in getattr(tree, "children", None) or ():
        yield from inside(child, kind)


def words(tree: Any) -> list[str]:
    """The words of a part of a tree."""
    if not hasattr(tree, "children"):
        return [str(tree.getText())] if tree.getText().strip() else []
    return [word for child in tree.children or () for word in words(child)]


def arguments_of(procedure: Any) -> tuple[tuple[str, str], ...]:
    """The declared arguments, from the words between the first bracket and its end."""
    found = []
    for part in inside(procedure, vbaParser.ParameterListContext):
        declared = [[]]  # type: ignore[var-annotated]
        for word in words(part):
            if word == ",":
                declared.append([])
            else:
                declared[-1].append(word)
        for one in declared:
            how = next((word for word in one if word in ("Optional", "ParamArray")), "")
            name = next(word for word in one if word not in ("Optional", "ParamArray", "ByVal", "ByRef"))
            found.append((name, how))
    return tuple(found)


@cache
def procedures() -> tuple[Declared, ...]:
    """Every procedure that the grammar finds in the module."""
    kinds = {
        vbaParser.FunctionDeclarationContext: (vbaParser.FunctionNameContext, "Function"),
        vbaParser.SubroutineDeclarationContext: (vbaParser.SubroutineNameContext, "Sub"),
    }
    found = []
    for context, (naming, kind) in kinds.items():
        for one in inside(module()[0], context):
            name = next(inside(one, naming)).getText()
            found.append(Declared(name, kind, words(one)[0] == "Public", arguments_of(one)))
    return tuple(found)


def functions() -> dict[str, Declared]:
    """The functions that a worksheet sees."""
    return {one.name: one for one in procedures() if one.public and one.kind == "Function"}


def body(name: str) -> list[str]:
    """The statements of a procedure without its first and last line, comments left out."""
    start = next(n for n, line in enumerate(LOGICAL) if re.match(rf"(Public|Private) \w+ {name}\(", line))
    end = next(n for n in range(start, len(LOGICAL)) if LOGICAL[n].startswith("End "))
    return [line.strip() for line in LOGICAL[start + 1 : end] if not line.strip().startswith("'")]


# --- the text -------------------------------------------------------------------------------------


def test_the_module_is_read_without_an_error_by_a_grammar_of_vba() -> None:
    """The whole text is one module of the language, named at its head as the editor wants it."""
    assert module()[1] == []
    assert LINES[0] == f'Attribute VB_Name = "{vba.MODULE}"'
    assert LINES[1] == "Option Explicit"


@pytest.mark.parametrize(
    ("right", "wrong"),
    [
        ("End Function", ""),
        ("Next column", ""),
        ("End If", ""),
        (" Then CellValue", " CellValue"),
        ("ByVal entry", "ByVal Next"),
        ("Array(beam, ", "Array(beam; "),
        ('"reaction"', '"reaction'),
        ("support As Variant", "support As"),
    ],
)
def test_a_broken_module_is_found_out(right: str, wrong: str) -> None:
    """The grammar is no formality: a block left open, a keyword as a name or a lost quote is an error."""
    name = re.escape(ENTRIES[0].name)
    match = re.search(rf"\A.*?^Public Function {name}\(.*?^End Function\r\n", TEXT, re.DOTALL | re.MULTILINE)
    assert match is not None
    short = match.group()
    assert right in short
    assert parsed(short)[1] == []
    assert parsed(short.replace(right, wrong, 1))[1]


def test_the_text_is_ascii_with_the_line_ends_of_windows() -> None:
    """The editor reads a file in the machine's own code page: only ASCII is the same in all of them."""
    assert TEXT.isascii()
    assert all(line.isprintable() for line in LINES)
    assert TEXT.count("\r\n") == TEXT.count("\n") == TEXT.count("\r")
    assert TEXT.endswith("\r\n")
    assert "\t" not in TEXT


def test_lines_are_as_short_as_the_editor_wants_them() -> None:
    """A line has at most 1023 characters, and a statement is continued at most 24 times."""
    assert max(map(len, LINES)) <= LONGEST_LINE
    continued = 0
    for line in LINES:
        continued = continued + 1 if line.endswith(" _") else 0
        assert continued <= MOST_CONTINUATIONS


def test_blocks_are_balanced() -> None:
    """Every procedure, loop and condition that is opened is closed by its own end, in order."""
    opening = re.compile(r"(?:(?:Public|Private) )?(Function|Sub|For|With|Do|While|Select)\b|If\b.*\bThen$")
    closing = {"Next": "For", "Loop": "Do", "Wend": "While"}
    held: list[str] = []
    for line in LOGICAL:
        words_of = line.split()
        if not words_of or words_of[0].startswith("'"):
            continue
        if words_of[0] == "End" and len(words_of) > 1:
            assert held.pop() == words_of[1], line
        elif words_of[0] in closing:
            assert held.pop() == closing[words_of[0]], line
        elif match := opening.match(line.strip()):
            held.append(match.group(1) or "If")
    assert held == []


# --- names ----------------------------------------------------------------------------------------


def kind_of(word: str) -> str:
    """What the grammar takes a word for: an identifier, or a keyword of its own."""
    token = vbaLexer(antlr4.InputStream(word)).nextToken()
    assert token.text == word
    return str(vbaLexer.symbolicNames[token.type])


def is_cell(name: str) -> bool:
    """Whether a worksheet reads a name as a reference, in either style of references."""
    return bool(re.fullmatch(r"[a-z]{1,3}\d{1,7}|r\d*(c\d*)?|c\d*", name.casefold()))


def test_names_of_keywords_and_references_are_told() -> None:
    """The two checks of names find what they look for."""
    assert {kind_of(word) for word in ("next", "To", "type", "END", "byval")}.isdisjoint({"IDENTIFIER"})
    assert kind_of("reaction_moment") == "IDENTIFIER"
    assert all(map(is_cell, ("AB12", "xfd1048576", "R1C1", "r", "C", "rc", "R2", "c3", "q1")))
    assert not any(map(is_cell, ("reaction", "beam_line", "moment_max", "row1a", "ABCD1")))


def test_names_of_procedures_are_unique_in_any_case_of_letters() -> None:
    """VBA does not tell `Reaction` from `reaction`: two such names, or one that is the module's, do not compile."""
    names = [one.name.casefold() for one in procedures()]
    variables = [line.split()[1].casefold() for line in LINES if re.match(r"(Private|Public|Dim|Const) \w+ As ", line)]
    every = [*names, *variables, vba.MODULE.casefold()]
    assert len(set(every)) == len(every)


def test_every_name_is_legal() -> None:
    """Names of functions and arguments are identifiers, no keywords, no cells, and not too long."""
    for one in procedures():
        assert kind_of(one.name) == "IDENTIFIER"
        assert not is_cell(one.name)
        assert one.name.isascii()
        assert len(one.name) <= LONGEST_NAME
    for declared in functions().values():
        names = [name.casefold() for name, _ in declared.arguments]
        assert len(set(names)) == len(names)
        assert "caller" not in names
        for name in names:
            assert kind_of(name) == "IDENTIFIER", name
            assert re.fullmatch(r"[a-z]\w*", name)


def test_arguments_hide_nothing_that_the_module_uses() -> None:
    """No argument or local variable of a function is called like a procedure that it may use, or the function itself.

    It may be called like another worksheet function, which no function calls: `combinations`.
    """
    used = {one.name.casefold() for one in procedures()} - set(catalogue())
    for declared in functions().values():
        procedures_of = used | {declared.name.casefold()}
        local = {line.split()[1].casefold() for line in body(declared.name) if line.startswith("Dim ")}
        names = {name.casefold() for name, _ in declared.arguments}
        assert not procedures_of & (local | names)
        assert not local & names


@pytest.mark.parametrize("word", ["to", "Next", "type", "END", "caller"])
def test_an_argument_called_like_a_keyword_gets_another_name(word: str) -> None:
    """An argument of a later function that is a keyword of VBA is declared under a legal name."""
    assert vba.legal(word) != word
    assert kind_of(vba.legal(word)) == "IDENTIFIER"
    assert vba.legal("beam") == "beam"


def test_no_name_is_taken_in_the_addin_that_the_module_goes_into() -> None:
    """xlwings' own VBA in that add-in has no public name and no module that is ours, and does have `XLPy`."""
    taken: set[str] = set()
    for _, _, module_name, code in VBA_Parser(str(template("quickstart_addin.xlam"))).extract_macros():
        taken.add(module_name.rpartition(".")[0].casefold())
        if module_name.endswith(".bas"):
            declared = r"^\s*(?:Public |Global )?(?:Declare (?:PtrSafe )?)?(?:Sub|Function|Const|Enum|Type) (\w+)"
            taken |= {name.casefold() for name in re.findall(declared, code, re.MULTILINE)}
    assert "xlpy" in taken
    assert not taken & {vba.MODULE.casefold(), *(one.name.casefold() for one in procedures())}


# --- the functions --------------------------------------------------------------------------------


def test_the_functions_are_those_of_the_catalogue() -> None:
    """A worksheet sees every function of the catalogue, and no other."""
    assert sorted(functions()) == sorted(catalogue())


@by_name
def test_each_function_has_the_arguments_of_the_catalogue(entry: Entry) -> None:
    """Arguments stand in the same order under the same names; the same may be left out or repeated."""
    how = {(False, False): "", (True, False): "Optional", (False, True): "ParamArray"}
    expected = [(vba.legal(one.name), how[one.optional, one.repeats]) for one in entry.arguments]
    declared = functions()[entry.name].arguments
    assert list(declared) == expected
    assert len(declared) <= MOST_ARGUMENTS
    assert [name for name, _ in declared] == [one.name for one in entry.arguments], "a name that VBA does not allow"


@by_name
def test_each_function_asks_python_for_itself_with_all_its_arguments(entry: Entry) -> None:
    """The name that is asked for, the arguments and their order are those of the declaration, and nothing else is."""
    names = [name for name, _ in functions()[entry.name].arguments]
    given = names[0] if entry.arguments[0].repeats else f"Array({', '.join(names)})"
    assert body(entry.name) == [
        "Dim arguments As Variant",
        f"arguments = {given}",
        f'{entry.name} = Answer("{entry.name}", arguments)',
    ]


def test_optional_arguments_come_last() -> None:
    """VBA wants everything behind an optional argument to be optional, and a `ParamArray` to stand alone."""
    for declared in functions().values():
        how = [kind for _, kind in declared.arguments]
        assert how == sorted(how)
        assert "ParamArray" not in how or how == ["ParamArray"]


def test_error_codes_become_genuine_error_values() -> None:
    """A whole number becomes the error value of that number by CVErr, in each entry; Python's silence is #VALUE!."""
    assert body("CellValue") == ["If VarType(entry) = vbLong Then CellValue = CVErr(entry) Else CellValue = entry"]
    walk = " ".join(body("WithErrors"))
    for assigned in ("WithErrors", "result(row, column)", "result(column)"):
        given = "result" if assigned == "WithErrors" else assigned
        assert f"{assigned} = CellValue({given})" in walk
    answer = body("Answer")
    assert f'Answer = WithErrors(XLPy.CallUDF("{vba.SERVED}", name, arguments))' in answer
    assert answer.index("On Error GoTo Failed") == 0
    assert answer[-1] == "Answer = CVErr(xlErrValue)"
    assert answer[answer.index("Failed:") - 1] == "Exit Function"


def test_no_text_of_an_error_reaches_a_cell() -> None:
    """What VBA says of a failure is kept for who asks; no function returns it, and none goes on after an error."""
    said = [line.strip() for line in LOGICAL if "Err.Description" in line]
    assert said
    assert all(
        not re.match(rf"({'|'.join([*functions(), 'Answer', 'WithErrors', 'CellValue'])}) =", line) for line in said
    )
    for name in [*functions(), "Answer", "WithErrors", "CellValue"]:
        assert not any("Resume" in line for line in body(name))


def test_a_path_is_cut_at_its_backslash() -> None:
    """Where the module looks for the name in a path, it looks for a backslash, which has survived its writing."""
    for sought in re.findall(r"InStrRev\([^,]+, (\"[^\"]*\")", TEXT):
        assert sought == '"\\"'


# --- the texts of the function wizard -------------------------------------------------------------

LITERAL = r'(?:"(?:[^"]|"")*"|ChrW\(\d+\))'
TEXT_OF = rf"{LITERAL}(?: & {LITERAL})*"


def decoded(expression: str) -> str:
    """What a VBA expression of joined texts and characters says."""
    assert re.fullmatch(TEXT_OF, expression)
    return "".join(
        chr(int(code)) if code else quoted.replace('""', '"')
        for quoted, code in re.findall(r'"((?:[^"]|"")*)"|ChrW\((\d+)\)', expression)
    )


def described(name: str) -> tuple[str, str, list[str]]:
    """The function that a description is for, its summary, and the help of each argument."""
    [statement] = body(f"Describe_{name}")
    match = re.fullmatch(rf"Describe ({TEXT_OF}), ({TEXT_OF}), Array\( ?({TEXT_OF}(?:, {TEXT_OF})*)\)", statement)
    assert match is not None, statement
    helps = [found.group() for found in re.finditer(TEXT_OF, match.group(3))]
    return decoded(match.group(1)), decoded(match.group(2)), [decoded(one) for one in helps]


@by_name
def test_the_wizard_shows_the_catalogue(entry: Entry) -> None:
    """Summary and help of every argument are the catalogue's to the letter, and not longer than Excel shows."""
    name, summary, helps = described(entry.name)
    assert (name, summary) == (entry.name, entry.summary)
    assert helps == [argument.help for argument in entry.arguments]
    assert len(summary) <= LONGEST_HELP
    assert all(0 < len(text) <= LONGEST_HELP for text in helps)
    assert all(ord(letter) < 0x10000 for text in [summary, *helps] for letter in text)


def test_every_function_is_described_once_when_the_addin_opens() -> None:
    """`Auto_Open` has all described, each by its own procedure, through `Application.MacroOptions`."""
    calls = [line.removeprefix("Describe_") for line in body("DescribeAll") if line.startswith("Describe_")]
    assert calls == [entry.name for entry in ENTRIES]
    assert "DescribeAll" in body("Auto_Open")
    [given] = body("Describe")
    assert given.startswith('Application.MacroOptions Macro:="\'" & ThisWorkbook.Name & "\'!" & name, ')
    for part in ("Description:=summary", f'Category:="{ENTRIES[0].category}"', "ArgumentDescriptions:=arguments"):
        assert part in given


def test_texts_are_decoded_as_vba_reads_them() -> None:
    """The reading of joined texts knows doubled quotes and characters by number, and refuses anything else."""
    assert decoded('"say ""kN" & ChrW(183) & "m"""') == 'say "kN\u00b7m"'
    with pytest.raises(AssertionError):
        decoded('"a" & b')


@pytest.mark.parametrize("text", ['say "kN·m²"', "plain", "·", 'ends in "', "ß" * 255])
def test_a_text_is_written_so_that_it_reads_the_same(text: str) -> None:
    """Whatever stands in a help text comes back from the VBA expression that is written for it."""
    assert decoded(vba._quoted(text)) == text


def test_a_help_text_that_is_too_long_is_refused() -> None:
    """Excel fails without a word on a longer text: it must not be written at all."""
    with pytest.raises(ValueError, match="255"):
        vba._quoted("x" * 256)
