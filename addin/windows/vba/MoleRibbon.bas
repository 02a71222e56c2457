Attribute VB_Name = "MoleRibbon"
' The commands of the moletally tab.
Option Explicit

Public Sub MoleRecalculate(ByVal control As IRibbonControl)
    Dim cell As Variant, done As String
    If Not HasBook() Then Exit Sub
    MoleAside.Finish
    For Each cell In MoleBook.OwnCells(ActiveWorkbook)
        ' Range.Dirty works on the active sheet alone; a sheet that is woken is calculated as a whole.
        If InStr(done, vbLf & cell.Worksheet.Name & vbLf) = 0 Then
            done = done & vbLf & cell.Worksheet.Name & vbLf
            cell.Worksheet.EnableCalculation = False
            cell.Worksheet.EnableCalculation = True
        End If
    Next cell
    Application.Calculate
    MoleAside.Tell
End Sub

Public Sub MoleReason(ByVal control As IRibbonControl)
    Dim cell As Range, home As Range, reason As String
    If Not HasBook() Then Exit Sub
    If ActiveCell Is Nothing Then
        MsgBox "Select a cell first.", vbInformation, "moletally"
        Exit Sub
    End If
    Set cell = ActiveCell
    Set home = MoleBook.HomeOf(cell)
    If InStr(1, home.Formula, MoleBook.STEM, vbTextCompare) = 0 Then
        MsgBox cell.Address(False, False) & " holds no formula of moletally.", vbInformation, "moletally"
        Exit Sub
    End If
    reason = ReasonOf(cell, home)
    If reason = "" Then reason = "There is nothing to report: every call of moletally in this formula was answered." & vbLf & _
        "MOLE_AUDIT lists what was read, assumed and checked."
    MsgBox cell.Address(False, False) & ": " & cell.Text & vbLf & vbLf & reason, vbInformation, "moletally"
End Sub

Public Sub MoleAuditBook(ByVal control As IRibbonControl)
    If HasBook() Then MoleAudit.AuditBook ActiveWorkbook
End Sub

Public Sub MoleHandOver(ByVal control As IRibbonControl)
    If HasBook() Then MoleCopy.HandOver ActiveWorkbook
End Sub

Public Sub MoleStatus(ByVal control As IRibbonControl)
    Dim result As Variant, text As String, i As Long
    text = "Macro file: moletally " & MoleSettings.OWN_VERSION & ", " & ThisWorkbook.FullName & vbLf
    If MoleTransport.Sent("about", Array(), result) Then
        If Not IsArray(result) Then
            text = text & MoleReasons.Unmarked(CStr(result))
        Else
            For i = LBound(result, 1) To UBound(result, 1)
                text = text & result(i, LBound(result, 2)) & ": " & result(i, UBound(result, 2)) & vbLf
            Next i
        End If
    Else
        text = text & "Python does not answer: " & MoleTransport.WhyAside()
    End If
    MsgBox text, vbInformation, "moletally"
End Sub

Public Sub MoleShowHelp(ByVal control As IRibbonControl)
    MoleHelp.WriteSheet
End Sub

' The calculation is done again, so that the reasons belong to what the cell shows.
Private Function ReasonOf(ByVal cell As Range, ByVal home As Range) As String
    Dim key As String
    If MoleTransport.IsAside() Then
        ReasonOf = MoleTransport.WhyAside()
        Exit Function
    End If
    key = home.Address(External:=True)
    MoleReasons.Forget key
    MoleBook.WholeOf(home).Calculate
    If IsError(cell.Value) Then ReasonOf = MoleReasons.ReasonAt(key, cell.Row - home.Row, cell.Column - home.Column)
    If ReasonOf = "" Then ReasonOf = MoleReasons.AllReasons(key)
End Function

Private Function HasBook() As Boolean
    HasBook = Not ActiveWorkbook Is Nothing
    If Not HasBook Then MsgBox "Open a workbook first.", vbInformation, "moletally"
End Function
