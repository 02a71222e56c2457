Attribute VB_Name = "MoleBook"
' Our cells in a workbook.
Option Explicit
Option Private Module

Public Const STEM As String = "MOLE_"

' The cells whose formula calls one of our functions; of an array its first cell.
Public Function OwnCells(ByVal book As Workbook) As Collection
    Dim sheet As Worksheet, own As Collection
    Set own = New Collection
    For Each sheet In book.Worksheets
        AddCells sheet, own
    Next sheet
    Set OwnCells = own
End Function

Private Sub AddCells(ByVal sheet As Worksheet, ByRef own As Collection)
    Dim formulas As Range, area As Range, texts As Variant, i As Long, j As Long
    On Error Resume Next ' none, or a protected sheet
    Set formulas = sheet.UsedRange.SpecialCells(xlCellTypeFormulas)
    On Error GoTo 0
    If formulas Is Nothing And sheet.ProtectContents Then Set formulas = sheet.UsedRange
    If formulas Is Nothing Then Exit Sub
    For Each area In formulas.Areas
        texts = area.Formula
        If Not IsArray(texts) Then
            If InStr(1, texts, STEM, vbTextCompare) > 0 Then AddHome area, own
        Else
            For i = 1 To UBound(texts, 1)
                For j = 1 To UBound(texts, 2)
                    If InStr(1, texts(i, j), STEM, vbTextCompare) > 0 Then AddHome area.Cells(i, j), own
                Next j
            Next i
        End If
    Next area
End Sub

Private Sub AddHome(ByVal cell As Range, ByRef own As Collection)
    Dim first As Range
    If Not cell.HasFormula Then Exit Sub
    Set first = HomeOf(cell)
    On Error Resume Next ' the key is there: another cell of the same array
    own.Add first, first.Worksheet.Name & "!" & first.Address
End Sub

' The cells that are calculated together with a formula's first cell.
Public Function WholeOf(ByVal cell As Object) As Range
    If IsFixedArray(cell) Then Set WholeOf = cell.CurrentArray Else Set WholeOf = cell
End Function

' True if a sheet with our cells is protected.
Public Function IsProtected(ByVal own As Collection) As Boolean
    Dim cell As Variant
    For Each cell In own
        If cell.Worksheet.ProtectContents Then IsProtected = True
    Next cell
End Function

' The cell that holds the formula behind a cell: itself, or the first cell of its array or spill.
Public Function HomeOf(ByVal cell As Object) As Range
    Dim parent As Range
    Set HomeOf = cell.Cells(1, 1)
    On Error Resume Next ' no dynamic arrays in this Excel, or no spill here
    Set parent = cell.Cells(1, 1).SpillParent
    On Error GoTo 0
    If Not parent Is Nothing Then
        Set HomeOf = parent
    ElseIf cell.Cells(1, 1).HasArray Then
        Set HomeOf = cell.Cells(1, 1).CurrentArray.Cells(1, 1)
    End If
End Function

' The cells over which a formula's result lies.
Public Function SpillOf(ByVal cell As Object) As Range
    Dim spill As Range
    Set SpillOf = cell
    On Error Resume Next
    Set spill = cell.SpillingToRange
    If Not spill Is Nothing Then Set SpillOf = spill
End Function

' The formula as it has to be entered again so that a dynamic array stays one.
Public Function FormulaOf(ByVal cell As Object) As String
    On Error GoTo OlderExcel
    FormulaOf = cell.Formula2
    Exit Function
OlderExcel:
    FormulaOf = cell.Formula
End Function

' True if the formula fills a fixed range of cells, entered with Ctrl+Shift+Enter.
Public Function IsFixedArray(ByVal cell As Object) As Boolean
    Dim spills As Boolean
    If Not cell.HasArray Then Exit Function
    On Error Resume Next
    spills = cell.HasSpill
    IsFixedArray = Not spills
End Function
