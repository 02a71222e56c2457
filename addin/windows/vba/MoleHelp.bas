Attribute VB_Name = "MoleHelp"
' Help for the function wizard, and the page of the Help command; the texts are those of the function table.
Option Explicit
Option Private Module

Private isDescribed As Boolean

' Tells Excel the descriptions, once. Excel takes them only while a visible book is active.
Public Sub Describe()
    If isDescribed Or ActiveWorkbook Is Nothing Then Exit Sub
    If Not IsTaken() Then DescribeShown
    isDescribed = True
End Sub

Private Function IsTaken() As Boolean
    Dim name As Variant
    On Error GoTo Refused
    For Each name In MoleTable.Names()
        Application.MacroOptions Macro:="'" & ThisWorkbook.Name & "'!" & name, Description:=MoleTable.Summary(name), _
            Category:=MoleTable.CATEGORY, ArgumentDescriptions:=MoleTable.ArgumentHelp(name)
    Next name
    IsTaken = True
Refused:
End Function

' Excel may refuse descriptions for a hidden add-in: shown for a moment, it takes them.
Private Sub DescribeShown()
    Dim taken As Boolean
    Application.ScreenUpdating = False
    ThisWorkbook.IsAddin = False
    taken = IsTaken()
    ThisWorkbook.IsAddin = True
    ThisWorkbook.Saved = True
    Application.ScreenUpdating = True
End Sub

' A new workbook with the functions, their arguments and what they give.
Public Sub WriteSheet()
    Dim sheet As Worksheet, name As Variant, row As Long, i As Long
    Set sheet = Application.Workbooks.Add(xlWBATWorksheet).Worksheets(1)
    sheet.Columns("A").ColumnWidth = 16
    sheet.Columns("B").ColumnWidth = 110
    sheet.Columns("B").WrapText = True
    sheet.Range("A1").Value = "Worksheet functions of moletally " & MoleSettings.OWN_VERSION
    row = 3
    For Each name In MoleTable.Names()
        sheet.Cells(row, 1).Value = MoleTable.Signature(name)
        sheet.Cells(row, 1).Font.Bold = True
        sheet.Cells(row + 1, 2).Value = MoleTable.Summary(name)
        row = row + 2
        For i = LBound(MoleTable.ArgumentNames(name)) To UBound(MoleTable.ArgumentNames(name))
            sheet.Cells(row, 1).Value = MoleTable.ArgumentNames(name)(i)
            sheet.Cells(row, 2).Value = MoleTable.ArgumentHelp(name)(i)
            row = row + 1
        Next i
        sheet.Cells(row, 1).Value = "Result"
        sheet.Cells(row, 2).Value = MoleTable.Result(name)
        row = row + 2
    Next name
    sheet.Cells(row, 1).Value = "An error cell has a reason: select it and choose Reason on the moletally tab, or read the first row of MOLE_AUDIT."
    sheet.Cells(row + 1, 1).Value = "The answers are those of ideal vessels. Heat removal, runaway, pressure relief: local codes and a licensed engineer decide."
    sheet.Range("A1").Font.Bold = True
End Sub
