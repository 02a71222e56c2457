Attribute VB_Name = "MoleAudit"
' The audit of a whole book: each of our cells is calculated once more, and what it asks is audited with the same arguments.
Option Explicit
Option Private Module

Private auditedHome As String ' "" while nothing is audited
Private rows As Collection

' Called with every call from a cell; does something only for the cell that is audited.
Public Sub Note(ByVal home As String, ByVal name As String, ByVal arguments As Variant)
    Dim asked() As Variant, i As Long, findings As Variant
    If auditedHome = "" Or home <> auditedHome Or name = "MOLE_AUDIT" Then Exit Sub
    ReDim asked(0 To UBound(arguments) - LBound(arguments) + 1)
    asked(0) = Mid(name, Len(MoleBook.STEM) + 1)
    For i = LBound(arguments) To UBound(arguments)
        asked(i - LBound(arguments) + 1) = arguments(i)
    Next i
    If Not MoleTransport.Sent("MOLE_AUDIT", asked, findings) Then Exit Sub
    If IsArray(findings) Then
        AddRows home, name, findings
    Else
        rows.Add Array(home, name, "stop", "", MoleReasons.Unmarked(CStr(findings)))
    End If
End Sub

' Writes the findings for all our cells of a book into a new workbook.
Public Sub AuditBook(ByVal book As Workbook)
    Dim cell As Variant, own As Collection, problem As String
    Set own = MoleBook.OwnCells(book)
    If own.Count = 0 Then problem = "There is no formula of moletally in " & book.Name & "."
    If MoleTransport.IsAside() Then problem = MoleTransport.WhyAside()
    If problem <> "" Then
        MsgBox problem, vbInformation, "moletally"
        Exit Sub
    End If
    Set rows = New Collection
    On Error GoTo Done
    For Each cell In own
        AuditCell cell
    Next cell
Done:
    problem = Err.Description
    auditedHome = ""
    MoleHost.ShowStatus ""
    If problem <> "" Then MsgBox "The audit stopped, the list is not complete: " & problem, vbExclamation, "moletally"
    If rows.Count > 0 Then WriteRows book.Name
End Sub

' A cell that asked nothing gets a row too: the list has to name every cell.
Private Sub AuditCell(ByVal cell As Range)
    Dim before As Long
    before = rows.Count
    auditedHome = cell.Address(External:=True)
    MoleHost.ShowStatus "moletally audits " & cell.Address(False, False)
    MoleBook.WholeOf(cell).Calculate
    If rows.Count = before Then
        rows.Add Array(auditedHome, "", "note", "", "no call was made, as in a branch of IF that is not taken; or the arguments can't be read: see Reason")
    End If
End Sub

Private Sub AddRows(ByVal home As String, ByVal name As String, ByVal findings As Variant)
    Dim i As Long, j As Long
    If MoleReasons.Dimensions(findings) = 1 Then
        i = LBound(findings)
        rows.Add Array(home, name, findings(i), findings(i + 1), findings(i + 2))
        Exit Sub
    End If
    j = LBound(findings, 2)
    For i = LBound(findings, 1) To UBound(findings, 1)
        rows.Add Array(home, name, findings(i, j), findings(i, j + 1), findings(i, j + 2))
    Next i
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
