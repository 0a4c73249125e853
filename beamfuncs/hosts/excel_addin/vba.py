"""The VBA module of the add-in, written from the catalogue: a function for each, its errors made genuine, its help.

It calls `XLPy.CallUDF`, the entry point that xlwings' own VBA offers, and is imported by hand: File > Import File.
"""

from __future__ import annotations

import re

from beamfuncs.catalogue import Argument, Entry, catalogue

MODULE = "BeamFuncs"
"""The name of the module in the VBA editor."""
SERVED = "beamfuncs.hosts.excel"
"""The Python module that xlwings serves."""
LONGEST_HELP = 255

_WORDS = (
    "abs access addressof alias and any append array as assert attribute base beep binary boolean byref byte byval call"
    " caller case cbool cbyte ccur cdate cdbl cdec chdir chdrive circle cint clng clnglng clngptr close compare const"
    " csng cstr currency cvar cverr database date debug decimal declare defbool defbyte defcur defdate defdbl defint"
    " deflng defobj defsng defstr defvar dim do doevents double each else elseif empty end endif enum eqv erase error"
    " event exit explicit false fix for format friend function get global go gosub goto if imp implements in input"
    " inputb instr instrb int is lbound len lenb let lib like line load local lock long longlong longptr loop lset me"
    " mid midb mod module new next not nothing null object on open option optional or output paramarray preserve print"
    " private property pset ptrsafe public put raiseevent random read redim rem reset resume return rset scale seek"
    " select set sgn shared single spc static step stop string sub tab text then time to true type typeof ubound unlock"
    " until variant vb_name wend while width with withevents write xor arguments"
)
RESERVED = frozenset(_WORDS.split())
"""Words that no argument may be called in VBA (MS-VBAL, Visual Basic for Applications language specification, section
3.3.5.2), with some that are legal but would hide a function of the language; `caller`, which xlwings keeps; and
`arguments`, which the module uses itself."""

_HEAD = f"""\
Attribute VB_Name = "{MODULE}"
Option Explicit

' Worksheet functions that solve any line beam. Written by "beamfuncs excel module": change nothing here.
' Verify results by independent means; local codes and a licensed engineer decide.

Private lastFailure As String

' Say why Python did not answer, where every cell shows #VALUE!. A box holds some 1000 letters, and the reason is last.
Public Sub BeamFuncsFailure()
    MsgBox IIf(lastFailure = "", "Python has answered so far.", Right$(lastFailure, 1000)), vbInformation, "{MODULE}"
End Sub

' Name the add-in by its folder on this machine, in a workbook that names it by the folder of another.
Public Sub BeamFuncsRelink()
    Dim link As Variant, file As String
    If IsEmpty(ActiveWorkbook.LinkSources(xlExcelLinks)) Then Exit Sub
    For Each link In ActiveWorkbook.LinkSources(xlExcelLinks)
        file = Mid$(link, InStrRev(link, "\\") + 1)
        If LCase$(file) = LCase$(ThisWorkbook.Name) And link <> ThisWorkbook.FullName Then
            ActiveWorkbook.ChangeLink link, ThisWorkbook.FullName, xlExcelLinks
        End If
    Next link
End Sub

Private Function Answer(ByVal name As String, ByVal arguments As Variant) As Variant
    On Error GoTo Failed
    If SettingsComeAlong Then Err.Raise 1000, Description:="The workbook brings settings that could start another" & _
        " Python: delete its sheet, or the file beside it, called " & PROJECT_NAME & ".conf."
    Answer = WithErrors(XLPy.CallUDF("{SERVED}", name, arguments))
    Exit Function
Failed:
    lastFailure = Err.Description
    Answer = CVErr(xlErrValue)
End Function

' Settings that come with a workbook go before the user's own, and say which program is started: they are refused.
Private Function SettingsComeAlong() As Boolean
    If Not ThisWorkbook.IsAddin Then Exit Function
    SettingsComeAlong = SheetExists(ActiveWorkbook, PROJECT_NAME & ".conf") Or FileExists(GetDirectoryConfigFilePath())
End Function

' A whole number (vbLong) is the code of an error value: results are never of that type.
Private Function CellValue(ByVal entry As Variant) As Variant
    If VarType(entry) = vbLong Then CellValue = CVErr(entry) Else CellValue = entry
End Function

' Python gives one value, a list (one row) or a table.
Private Function WithErrors(ByVal result As Variant) As Variant
    Dim row As Long, column As Long
    If Not IsArray(result) Then
        WithErrors = CellValue(result)
        Exit Function
    End If
    If IsTable(result) Then
        For row = LBound(result, 1) To UBound(result, 1)
            For column = LBound(result, 2) To UBound(result, 2)
                result(row, column) = CellValue(result(row, column))
            Next column
        Next row
    Else
        For column = LBound(result) To UBound(result)
            result(column) = CellValue(result(column))
        Next column
    End If
    WithErrors = result
End Function

Private Function IsTable(ByVal result As Variant) As Boolean
    Dim bound As Long
    On Error Resume Next
    bound = UBound(result, 2)
    IsTable = (Err.Number = 0)
End Function
"""

_OPENING = """\
' The texts of the function wizard. Excel gives none to a hidden workbook, so the add-in is shown for that moment.
Public Sub Auto_Open()
    Dim unchanged As Boolean
    On Error Resume Next
    unchanged = ThisWorkbook.Saved
    Application.ScreenUpdating = False
    If ThisWorkbook.IsAddin Then
        ThisWorkbook.IsAddin = False
        ThisWorkbook.Windows(1).Visible = True
        DescribeAll
        ThisWorkbook.IsAddin = True
    Else
        DescribeAll
    End If
    ThisWorkbook.Saved = unchanged
    Application.ScreenUpdating = True
End Sub

Private Sub DescribeAll()
    On Error Resume Next
{describe}
End Sub
"""

_DESCRIBE = """\
Private Sub Describe(ByVal name As String, ByVal summary As String, ByVal arguments As Variant)
    Application.MacroOptions Macro:="'" & ThisWorkbook.Name & "'!" & name, Description:=summary, _
        Category:="{category}", ArgumentDescriptions:=arguments
End Sub
"""


def module_text() -> str:
    """Return the text of the VBA module, in ASCII, its lines ended as the VBA editor ends them."""
    entries = list(catalogue().values())
    (category,) = {entry.category for entry in entries}
    opening = _OPENING.format(describe="\n".join(f"    Describe_{entry.name}" for entry in entries))
    blocks = [
        _HEAD,
        *map(_function, entries),
        opening,
        _DESCRIBE.format(category=category),
        *map(_description, entries),
    ]
    return "\n".join(blocks).replace("\n", "\r\n")


def legal(name: str) -> str:
    """Return the name of an argument as VBA allows it.

    >>> legal("beam"), legal("to")
    ('beam', 'to_')
    """
    return f"{name}_" if name.casefold() in RESERVED else name


def _function(entry: Entry) -> str:
    *before, last = entry.arguments
    if last.repeats and before:
        raise ValueError(f"{entry.name}: VBA takes repeated arguments alone")
    given = legal(last.name) if last.repeats else f"Array({', '.join(legal(one.name) for one in entry.arguments)})"
    return "\n".join(
        [
            f"Public Function {entry.name}({', '.join(map(_declared, entry.arguments))}) As Variant",
            "    Dim arguments As Variant",
            f"    arguments = {given}",
            f'    {entry.name} = Answer("{entry.name}", arguments)',
            "End Function",
            "",
        ]
    )


def _declared(argument: Argument) -> str:
    name = legal(argument.name)
    if argument.repeats:
        return f"ParamArray {name}() As Variant"
    return f"Optional {name} As Variant" if argument.optional else f"{name} As Variant"


def _description(entry: Entry) -> str:
    helps = ", _\n        ".join(_quoted(argument.help) for argument in entry.arguments)
    return "\n".join(
        [
            f"Private Sub Describe_{entry.name}()",
            f'    Describe "{entry.name}", {_quoted(entry.summary)}, Array( _',
            f"        {helps})",
            "End Sub",
            "",
        ]
    )


def _quoted(text: str) -> str:
    """Return text as a VBA expression in ASCII: the editor reads a file in the code page of the machine.

    >>> _quoted("[force·length]")
    '"[force" & ChrW(183) & "length]"'
    """
    if len(text) > LONGEST_HELP:
        raise ValueError(f"the function wizard shows {LONGEST_HELP} characters, not {len(text)}: {text}")
    parts = re.split(r"([^\x20-\x7e])", text.replace('"', '""'))
    return " & ".join(f"ChrW({ord(part)})" if i % 2 else f'"{part}"' for i, part in enumerate(parts) if part)
