Attribute VB_Name = "MoleAside"
' While there is no Python: cells keep their last values, one message tells why, and a save asks before it stores errors.
Option Explicit
Option Private Module

Private untold As Boolean      ' a cell asked in vain since the last calculation
Private isTold As Boolean      ' the user knows
Private noValue As Collection  ' cells that had no value to keep, by address
Private resting As Collection  ' sheets whose calculation is off

' Called when the service is found missing, maybe in the middle of a calculation: the rest waits until it is over.
Public Sub Begin()
    Set noValue = New Collection
    isTold = False
End Sub

' What a cell shows while there is no service: its last answer, or #N/A if none is known for its formula.
Public Function LastValue(ByVal home As String) As Variant
    Dim value As Variant
    untold = True
    If MoleKept.IsKept(home, MoleHost.Formula(), value) Then
        LastValue = value
    Else
        NoteWithout home
        LastValue = MoleReasons.Shown(home, MoleReasons.Marked("#N/A", "there is no Python behind the cells: " & MoleTransport.WhyAside()))
    End If
End Function

Private Sub NoteWithout(ByVal home As String)
    On Error Resume Next ' it is noted already
    noValue.Add home, home
End Sub

' After a calculation that asked in vain: tells once what is wrong, and lets the sheets with our cells rest.
Public Sub Tell()
    If Not untold Then Exit Sub
    untold = False
    RestSheets
    If isTold Then Exit Sub
    isTold = True
    MsgBox MoleTransport.WhyAside() & vbLf & vbLf & "Sheets with cells of moletally keep their values until then: they are not calculated." & vbLf & _
        "When it is mended, choose Recalculate on the moletally tab.", vbExclamation, "moletally"
End Sub

' Tries again and wakes the sheets; they calculate at once, so everything else has to be forgotten before.
Public Sub Finish()
    Dim sleeping As Collection, sheet As Object
    MoleTransport.TryAgain
    Set sleeping = resting
    Set resting = Nothing
    Set noValue = Nothing
    untold = False
    If sleeping Is Nothing Then Exit Sub
    On Error Resume Next ' a book may have been closed meanwhile
    For Each sheet In sleeping
        sheet.EnableCalculation = True
    Next sheet
End Sub

' False if the user would rather not store #N/A over values of this book.
Public Function MaySave(ByVal book As Workbook) As Boolean
    Dim home As Variant, count As Long
    MaySave = True
    If noValue Is Nothing Then Exit Function
    For Each home In noValue
        If InStr(1, home, "[" & Replace(book.Name, "'", "''") & "]", vbTextCompare) > 0 Then count = count + 1
    Next home
    If count = 0 Then Exit Function
    MaySave = (MsgBox(CStr(count) & " cells of moletally show #N/A because there is no Python behind them. " & _
        "Saving would store that in place of their last values." & vbLf & vbLf & "Save anyway?", _
        vbExclamation + vbYesNo + vbDefaultButton2, "moletally") = vbYes)
End Function

Private Sub RestSheets()
    Dim book As Workbook
    If resting Is Nothing Then Set resting = New Collection
    For Each book In Application.Workbooks
        RestBook book
    Next book
End Sub

' A book that is opened while there is no service rests too.
Public Sub Opened(ByVal book As Workbook)
    If Not MoleTransport.IsAside() Then Exit Sub
    If MoleBook.OwnCells(book).Count > 0 Then untold = True
    Tell
End Sub

Private Sub RestBook(ByVal book As Workbook)
    Dim cell As Variant, sheet As Object
    For Each cell In MoleBook.OwnCells(book)
        Set sheet = cell.Worksheet
        If sheet.EnableCalculation Then
            sheet.EnableCalculation = False
            resting.Add sheet
        End If
    Next cell
End Sub
