Attribute VB_Name = "xleq_functions"
' Chemical-equilibrium worksheet functions, made by xleq 0.1.0 from its table of functions.
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

Public Function XLEQ_KP(ByRef Kc As Variant, ByRef reaction As Variant, ByRef T As Variant, Optional ByRef pressure_unit As Variant, Optional ByRef concentration_unit As Variant) As Variant
    On Error GoTo failure
    XLEQ_KP = Result(XLPy.CallUDF(PYTHON_MODULE, "XLEQ_KP", _
        Array(Plain(Kc), Plain(reaction), Plain(T), Plain(pressure_unit), Plain(concentration_unit)), ThisWorkbook, Application.Caller))
    Exit Function
failure:
    XLEQ_KP = Failed(Err.Description)
End Function

Public Function XLEQ_REACTION(ByRef reaction As Variant, ByRef property_ As Variant, Optional ByRef T As Variant, Optional ByRef data As Variant) As Variant
    On Error GoTo failure
    XLEQ_REACTION = Result(XLPy.CallUDF(PYTHON_MODULE, "XLEQ_REACTION", _
        Array(Plain(reaction), Plain(property_), Plain(T), Plain(data)), ThisWorkbook, Application.Caller))
    Exit Function
failure:
    XLEQ_REACTION = Failed(Err.Description)
End Function

Public Function XLEQ_VERSION() As Variant
    On Error GoTo failure
    XLEQ_VERSION = Result(XLPy.CallUDF(PYTHON_MODULE, "XLEQ_VERSION", _
        Array(), ThisWorkbook, Application.Caller))
    Exit Function
failure:
    XLEQ_VERSION = Failed(Err.Description)
End Function

' Run this macro once to give the function wizard its help.
Public Sub XLEQ_Register_Help()
    Help_XLEQ_KP
    Help_XLEQ_REACTION
    Help_XLEQ_VERSION
End Sub

Private Sub Help_XLEQ_KP()
    Application.MacroOptions Macro:="XLEQ_KP", Category:="xleq", _
        Description:="Kp in the pressure unit", _
        ArgumentDescriptions:=Array( _
        "constant on concentrations", _
        "reaction text such as N2 + 3 H2 = 2 NH3", _
        "absolute temperature [K]", _
        "absolute pressure unit of Kp; default bar", _
        "concentration unit of Kc; default mol/L")
End Sub

Private Sub Help_XLEQ_REACTION()
    Application.MacroOptions Macro:="XLEQ_REACTION", Category:="xleq", _
        Description:="dH, dG [kJ/mol], dS, dCp [J/(mol K)], lnK or log10K [-] at T", _
        ArgumentDescriptions:=Array( _
        "reaction text such as N2 + 3 H2 = 2 NH3", _
        "what is wanted; known: dH, dS, dG, dCp, lnK, log10K", _
        "temperature [K]; default 298.15", _
        "formation data with a header row, in place of the built-in or beside them; optional")
End Sub

Private Sub Help_XLEQ_VERSION()
    Application.MacroOptions Macro:="XLEQ_VERSION", Category:="xleq", _
        Description:="program and data version, as text"
End Sub
