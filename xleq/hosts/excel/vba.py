"""The functions as VBA text: what Excel calls, and what turns error texts into true errors.

The text is plain ASCII, because the editor reads modules in the machine's own code page.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable
from typing import Final

from xleq import __version__
from xleq.functions import TABLE, Function
from xleq.hosts.excel.names import argument_description, description, vba_name

#: Name of the VBA module.
MODULE: Final = "xleq_functions"
_CATEGORY: Final = "xleq"

_HEAD: Final = """\
Attribute VB_Name = "{module}"
' Chemical-equilibrium worksheet functions, made by xleq {version} from its table of functions.
' Each call goes to Python through xlwings: this project needs xlwings' VBA module, which a workbook made by
' "xlwings quickstart NAME --standalone" and the add-in made by "xleq excel install" have.
' Sheet xlwings.conf (or xleq.conf in the add-in): Interpreter_Win = path of the environment's pythonw.exe.
Option Explicit

Private Const PYTHON_MODULE As String = "xleq.hosts.excel.udf"

' Run this macro (Alt+F8) to see reasons in place of errors, and again to see errors.
Public Sub XLEQ_Show_Reasons()
    SaveSetting "xleq", "excel", "reasons", IIf(ReasonsShown(), "no", "yes")
    Application.CalculateFull
End Sub

Private Function ReasonsShown() As Boolean
    ReasonsShown = (GetSetting("xleq", "excel", "reasons", "no") = "yes")
End Function

' An argument's plain values: no currency or date, one area, whole columns as far as they are used.
Private Function Plain(ByRef given As Variant) As Variant
    Dim area As Range
    Dim sheet As Worksheet
    If Not IsObject(given) Then
        Plain = given
        Exit Function
    End If
    If Not TypeOf given Is Range Then
        Plain = CVErr(xlErrValue)
        Exit Function
    End If
    Set area = given
    If area.Areas.Count > 1 Then
        Plain = CVErr(xlErrValue)
        Exit Function
    End If
    Set sheet = area.Worksheet
    If area.Rows.Count = sheet.Rows.Count Or area.Columns.Count = sheet.Columns.Count Then
        With sheet.UsedRange
            Set area = Application.Intersect(area, _
                sheet.Range(sheet.Cells(1, 1), .Cells(.Rows.Count, .Columns.Count)))
        End With
    End If
    If area Is Nothing Then
        Plain = Empty
    Else
        Plain = area.Value2
    End If
End Function

Private Function Result(ByVal found As Variant) As Variant
    Dim reasons As Boolean
    Dim i As Long
    Dim j As Long
    reasons = ReasonsShown()
    If Not IsArray(found) Then
        Result = OneCell(found, reasons)
        Exit Function
    End If
    If Dimensions(found) = 1 Then
        For i = LBound(found) To UBound(found)
            found(i) = OneCell(found(i), reasons)
        Next i
    Else
        For i = LBound(found, 1) To UBound(found, 1)
            For j = LBound(found, 2) To UBound(found, 2)
                found(i, j) = OneCell(found(i, j), reasons)
            Next j
        Next i
    End If
    Result = found
End Function

Private Function Dimensions(ByRef found As Variant) As Long
    Dim last As Long
    On Error GoTo one
    last = UBound(found, 2)
    Dimensions = 2
    Exit Function
one:
    Dimensions = 1
End Function

' The error that a text such as "#NUM! and the reason" stands for; any other value as it is.
Private Function OneCell(ByVal found As Variant, ByVal reasons As Boolean) As Variant
    Dim space As Long
    Dim number As Long
    OneCell = found
    If VarType(found) <> vbString Then Exit Function
    If Left$(found, 1) <> "#" Then Exit Function
    space = InStr(found & " ", " ")
    Select Case Left$(found, space - 1)
        Case "#NULL!": number = xlErrNull
        Case "#DIV/0!": number = xlErrDiv0
        Case "#VALUE!": number = xlErrValue
        Case "#REF!": number = xlErrRef
        Case "#NAME?": number = xlErrName
        Case "#NUM!": number = xlErrNum
        Case "#N/A": number = xlErrNA
        Case Else: Exit Function
    End Select
    If reasons And Len(found) > space Then Exit Function
    OneCell = CVErr(number)
End Function

Private Function Failed(ByVal description As String) As Variant
    If ReasonsShown() Then
        Failed = "xleq: " & description
    Else
        Failed = CVErr(xlErrValue)
    End If
End Function
"""

_FUNCTION: Final = """
Public Function {name}({signature}) As Variant
    On Error GoTo failure
    {name} = Result(XLPy.CallUDF(PYTHON_MODULE, "{name}", _
        Array({values}), ThisWorkbook, Application.Caller))
    Exit Function
failure:
    {name} = Failed(Err.Description)
End Function
"""

_HELP: Final = """
' Run this macro once to give the function wizard its help.
Public Sub XLEQ_Register_Help()
{calls}
End Sub
"""


def module_text(functions: Iterable[Function] | None = None) -> str:
    """The whole VBA module, ready to be imported or pasted.

    Parameters
    ----------
    functions : iterable of Function, optional
        All of the table by default.
    """
    chosen = list(TABLE.values() if functions is None else functions)
    parts = [_HEAD.format(module=MODULE, version=__version__)]
    parts += [_function(f) for f in chosen]
    parts.append(_HELP.format(calls="\n".join(f"    Help_{f.name}" for f in chosen)))
    parts += [_help(f) for f in chosen]
    return "".join(parts)


def pasted_text() -> str:
    """The module without its attribute line, which the editor takes only when importing a file."""
    return module_text().partition("\n")[2]


def _function(function: Function) -> str:
    signature = ", ".join(
        f"Optional ByRef {vba_name(a)} As Variant" if a.optional else f"ByRef {vba_name(a)} As Variant"
        for a in function.arguments
    )
    values = ", ".join(f"Plain({vba_name(a)})" for a in function.arguments)
    return _FUNCTION.format(name=function.name, signature=signature, values=values)


def _help(function: Function) -> str:
    lines = [
        f"\nPrivate Sub Help_{function.name}()",
        f'    Application.MacroOptions Macro:="{function.name}", Category:="{_CATEGORY}", _',
        f"        Description:={_string(description(function))}",
    ]
    if function.arguments:
        texts = [_string(argument_description(a)) for a in function.arguments]
        lines[-1] += ", _"
        lines.append("        ArgumentDescriptions:=Array( _")
        lines += [f"        {text}, _" for text in texts[:-1]]
        lines.append(f"        {texts[-1]})")
    return "\n".join([*lines, "End Sub", ""])


def _string(text: str) -> str:
    """A VBA string of ASCII: quotes doubled, other characters by their number."""
    parts: list[str] = []
    plain = ""
    for character in unicodedata.normalize("NFC", text):
        if " " <= character <= "~":
            plain += '""' if character == '"' else character
            continue
        parts += [f'"{plain}"'] if plain else []
        parts.append(f"ChrW({ord(character)})")
        plain = ""
    if plain or not parts:
        parts.append(f'"{plain}"')
    return " & ".join(parts)
