Attribute VB_Name = "MoleAudit"
' The audit of a whole book: each of our cells is calculated once more, and what it asks is audited with the same arguments.
Option Explicit
Option Private Module

Private isOn As Boolean
Private rows As Collection

' Called with every call from a cell; does something only while a book is audited.
Public Sub Note(ByVal home As String, ByVal name As String, ByVal arguments As Variant)
    Dim asked() As Variant, i As Long, findings As Variant
    If Not isOn Or name = "MOLE_AUDIT" Then Exit Sub
    ReDim asked(0 To UBound(arguments) - LBound(arguments) + 1)
    asked(0) = Mid(name, Len(MoleBook.STEM) + 1)
    For i = LBound(arguments) To UBound(arguments)
        asked(i - LBound(arguments) + 1) = arguments(i)
    Next i
    If MoleTransport.Sent("MOLE_AUDIT", asked, findings) Then AddRows home, name, findings
End Sub

' Writes the findings for all our cells of a book into a new workbook.
Public Sub AuditBook(ByVal book As Workbook)
    Dim cell As Variant, cells As Collection
    Set cells = MoleBook.OwnCells(book)
    If cells.Count = 0 Then
        MsgBox "There is no formula of moletally in " & book.Name & ".", vbInformation, "moletally"
        Exit Sub
    End If
    Set rows = New Collection
    isOn = True
    On Error GoTo Done
    For Each cell In cells
        MoleHost.ShowStatus "moletally audits " & cell.Address(False, False)
        cell.Dirty
        cell.Calculate
    Next cell
Done:
    isOn = False
    MoleHost.ShowStatus ""
    If Err.Number <> 0 Then
        MsgBox "The audit stopped: " & Err.Description, vbExclamation, "moletally"
    Else
        WriteRows book.Name
    End If
End Sub

Private Sub AddRows(ByVal home As String, ByVal name As String, ByVal findings As Variant)
    Dim i As Long, j As Long
    On Error GoTo OneRow
    j = LBound(findings, 2)
    On Error GoTo 0
    For i = LBound(findings, 1) To UBound(findings, 1)
        rows.Add Array(home, name, findings(i, j), findings(i, j + 1), findings(i, j + 2))
    Next i
    Exit Sub
OneRow:
    i = LBound(findings)
    rows.Add Array(home, name, findings(i), findings(i + 1), findings(i + 2))
End Sub

Private Sub WriteRows(ByVal bookName As String)
    Dim sheet As Worksheet, block() As Variant, i As Long, j As Long
    ReDim block(0 To rows.Count, 0 To 4)
    For j = 0 To 4
        block(0, j) = Array("Cell", "Function", "Level", "Where", "What and what to do")(j)
        For i = 1 To rows.Count
            block(i, j) = rows(i)(j)
        Next i
    Next j
    Set sheet = Application.Workbooks.Add(xlWBATWorksheet).Worksheets(1)
    sheet.Range("A1").Value = "Audit of " & bookName & " by moletally " & MoleSettings.OWN_VERSION & ", " & Format(Now, "yyyy-mm-dd hh:nn")
    sheet.Range("A3").Resize(rows.Count + 1, 5).NumberFormat = "@"
    sheet.Range("A3").Resize(rows.Count + 1, 5).Value = block
    sheet.Range("A1,A3:E3").Font.Bold = True
    sheet.Columns("A:D").AutoFit
    sheet.Columns("A").ColumnWidth = 26
    sheet.Columns("E").ColumnWidth = 90
    sheet.Columns("E").WrapText = True
    sheet.Range("A1").WrapText = False
End Sub
