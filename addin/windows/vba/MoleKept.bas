Attribute VB_Name = "MoleKept"
' The last answers of this session, for the time when there is no Python behind the cells. Excel itself gives a
' function no way to read what its cell showed before: it answers 0.
Option Explicit
Option Private Module

Private Const MOST As Long = 20000 ' formulas

Private formulas As Collection ' by cell
Private answers As Collection ' by cell

' Keeps the answer of a formula that is one call and nothing else: only there the cell shows what the call gave.
Public Sub Keep(ByVal home As String, ByVal formula As String, ByVal answer As Variant)
    If home = "" Or Not IsBareCall(formula) Then Exit Sub
    If answers Is Nothing Then
        Set formulas = New Collection
        Set answers = New Collection
    End If
    Forget home
    If answers.Count >= MOST Then Exit Sub
    formulas.Add formula, home
    answers.Add answer, home
End Sub

' True and the answer if the same formula in the same cell had one.
Public Function IsKept(ByVal home As String, ByVal formula As String, ByRef answer As Variant) As Boolean
    On Error GoTo Unknown
    If formulas.Item(home) = formula Then
        answer = answers.Item(home)
        IsKept = True
    End If
Unknown:
End Function

' Another book of the same name may come: what was kept for the cells of the first must not reach it.
Public Sub ForgetAll()
    Set formulas = Nothing
    Set answers = Nothing
End Sub

Private Sub Forget(ByVal home As String)
    On Error Resume Next ' there was none
    formulas.Remove home
    answers.Remove home
End Sub

' True for "=MOLE_X(...)" and nothing around it.
Public Function IsBareCall(ByVal formula As String) As Boolean
    Dim text As String, at As Long, depth As Long, letter As String
    text = MoleSpelling.OwnSpelling(formula)
    If StrComp(Left(text, Len(MoleBook.STEM) + 1), "=" & MoleBook.STEM, vbTextCompare) <> 0 Then Exit Function
    at = InStr(text, "(")
    Do While at > 0 And at <= Len(text)
        letter = Mid(text, at, 1)
        If letter = Chr(34) Or letter = "'" Then
            at = MoleSpelling.AfterQuoted(text, at)
        Else
            If letter = "(" Then depth = depth + 1
            If letter = ")" Then depth = depth - 1
            If depth = 0 Then Exit Do
            at = at + 1
        End If
    Loop
    IsBareCall = (at > 0 And at = Len(text))
End Function
