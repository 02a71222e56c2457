Attribute VB_Name = "MoleHost"
' What a call needs of Excel itself: the calling cell, the values of a range, the status bar.
Option Explicit
Option Private Module

' The first cell of the calling formula, with its sheet and book; "" if no cell calls.
Public Function Home() As String
    If TypeName(Application.Caller) = "Range" Then Home = Application.Caller.Cells(1, 1).Address(External:=True)
End Function

' The calling cell's formula; "" if no cell calls.
Public Function Formula() As String
    If TypeName(Application.Caller) = "Range" Then Formula = Application.Caller.Cells(1, 1).Formula
End Function

' The values of a range. False with the reason if it isn't one range.
Public Function RangeRead(ByVal source As Object, ByRef values As Variant, ByRef problem As String) As Boolean
    Dim inside As Range, one(1 To 1, 1 To 1) As Variant
    If TypeName(source) <> "Range" Then
        problem = "give a range or a value"
        Exit Function
    End If
    If source.Areas.Count > 1 Then
        problem = "this is several ranges; give one range"
        Exit Function
    End If
    Set inside = Used(source)
    values = inside.Value
    If Not IsArray(values) Then
        one(1, 1) = values
        values = one
    End If
    Uncut inside, values
    RangeRead = True
End Function

Public Sub ShowStatus(ByVal text As String)
    On Error Resume Next ' a text that Excel does not want now is no reason for an error in a cell
    If text = "" Then Application.StatusBar = False Else Application.StatusBar = text
End Sub

' A range without the empty rows and columns behind the sheet's last used cell: whole columns are quick.
Private Function Used(ByVal source As Range) As Range
    Dim last As Range, rows As Long, columns As Long
    Set last = source.Worksheet.UsedRange
    Set last = last.Cells(last.Rows.Count, last.Columns.Count)
    rows = Application.Max(1, Application.Min(source.Rows.Count, last.Row - source.Row + 1))
    columns = Application.Max(1, Application.Min(source.Columns.Count, last.Column - source.Column + 1))
    Set Used = source.Resize(rows, columns)
End Function

' Value cuts a cell that is formatted as a currency to four decimals: such cells are taken from Value2.
Private Sub Uncut(ByVal source As Range, ByRef values As Variant)
    Dim i As Long, j As Long
    For i = LBound(values, 1) To UBound(values, 1)
        For j = LBound(values, 2) To UBound(values, 2)
            If VarType(values(i, j)) = vbCurrency Then values(i, j) = source.Cells(i, j).Value2
        Next j
    Next i
End Sub
