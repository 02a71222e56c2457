Attribute VB_Name = "MoleAside"
' While there is no Python: cells keep their last values, one message tells why, and a save asks before it stores errors.
Option Explicit
Option Private Module

Private untold As Boolean
Private noValue As Collection  ' cells that had no value to keep, by address
Private resting As Collection  ' sheets whose calculation is off

' Called when the service is found missing, in the middle of a calculation: the rest waits until it is over.
Public Sub Begin()
    untold = True
    Set noValue = New Collection
End Sub

' What a cell shows while there is no service: its last value, or #N/A if it never had one.
Public Function LastValue(ByVal home As String) As Variant
    Dim value As Variant
    If HasValue(value) Then
        LastValue = value
    Else
        NoteWithout home
        LastValue = MoleReasons.Shown(home, MoleReasons.Marked("#N/A", "there is no Python behind the cells: " & MoleTransport.WhyAside()))
    End If
End Function

' True and the value if the calling cell shows one that can be kept.
Private Function HasValue(ByRef value As Variant) As Boolean
    On Error GoTo Unknown
    value = ShownValue(Application.Caller)
    HasValue = Not IsError(value)
Unknown:
End Function

Private Sub NoteWithout(ByVal home As String)
    On Error Resume Next ' it is noted already
    noValue.Add home, home
End Sub

' After a calculation: tells once what is wrong, and lets the sheets with our cells rest. Books without our
' cells are not bothered.
Public Sub Tell()
    If Not untold Then Exit Sub
    RestSheets
    If resting.Count = 0 Then Exit Sub
    untold = False
    MsgBox MoleTransport.WhyAside() & vbLf & vbLf & "Sheets with cells of moletally keep their values until then: they are not calculated." & vbLf & _
        "When it is mended, choose Recalculate on the moletally tab.", vbExclamation, "moletally"
End Sub

' Wakes the sheets and tries again.
Public Sub Finish()
    Dim sheet As Object
    If Not resting Is Nothing Then
        On Error Resume Next ' a book may have been closed meanwhile
        For Each sheet In resting
            sheet.EnableCalculation = True
        Next sheet
        On Error GoTo 0
    End If
    Set resting = Nothing
    Set noValue = Nothing
    untold = False
    MoleTransport.TryAgain
End Sub

' False if the user would rather not store #N/A over values of this book.
Public Function MaySave(ByVal book As Workbook) As Boolean
    Dim home As Variant, count As Long
    MaySave = True
    If noValue Is Nothing Then Exit Function
    For Each home In noValue
        If InStr(1, home, "[" & book.Name & "]", vbTextCompare) > 0 Then count = count + 1
    Next home
    If count = 0 Then Exit Function
    MaySave = (MsgBox(CStr(count) & " cells of moletally show #N/A because there is no Python behind them. " & _
        "Saving would store that in place of their last values." & vbLf & vbLf & "Save anyway?", _
        vbExclamation + vbYesNo + vbDefaultButton2, "moletally") = vbYes)
End Function

Private Sub RestSheets()
    Dim book As Workbook
    For Each book In Application.Workbooks
        RestBook book
    Next book
End Sub

' A book that is opened while there is no service rests too.
Public Sub Opened(ByVal book As Workbook)
    If Not MoleTransport.IsAside() Then Exit Sub
    RestBook book
    Tell
End Sub

Private Sub RestBook(ByVal book As Workbook)
    Dim cell As Variant, sheet As Object
    If resting Is Nothing Then Set resting = New Collection
    For Each cell In MoleBook.OwnCells(book)
        Set sheet = cell.Worksheet
        If sheet.EnableCalculation Then
            sheet.EnableCalculation = False
            resting.Add sheet
        End If
    Next cell
End Sub

' What the calling cells show now. Excel gives 0 where it sees a circle in the question: then the text tells.
Private Function ShownValue(ByVal caller As Range) As Variant
    Dim cells As Range
    Set cells = caller
    If caller.Count = 1 Then Set cells = MoleBook.SpillOf(caller)
    ShownValue = cells.Value2
    If IsEmpty(cells.Cells(1, 1).Value2) Then
        ShownValue = CVErr(xlErrNA)
    ElseIf VarType(ShownValue) = vbDouble Then
        If ShownValue = 0 And cells.Text Like "*[1-9]*" Then ShownValue = CVErr(xlErrNA)
    End If
End Function
