Attribute VB_Name = "MoleScenarios"
' Scenarios run in one go each, as a spreadsheet program would call; each gives a text that the test compares.
Option Explicit

Private Function Cell(ByVal value As Variant) As String
    If IsError(value) Then
        Cell = "error " & CStr(CLng(value))
    Else
        Cell = TypeName(value) & " " & CStr(value)
    End If
End Function

Public Function Wrappers() As String
    Dim table(1 To 2, 1 To 3) As Variant
    table(1, 1) = "Reaction"
    MoleLibrary.Script "seeee"
    MoleHost.CallFrom "[Book]S!$A$1"
    Wrappers = Cell(MOLE_CSTR(table, table, 2.5, "B/A", table)) & vbLf & Cell(MOLE_PFR(table)) & vbLf & _
        Cell(MOLE_RATES(table, table)) & vbLf & Cell(MOLE_AUDIT("CSTR", table, 2.5, True, ""))
End Function

Public Function Command(ByVal python As String) As String
    Command = MoleSettings.StartCommand(python, 7)
End Function

Public Function Errors() As String
    Dim block As Variant, number As Variant
    MoleLibrary.Script "smb"
    MoleHost.CallFrom "[Book]S!$B$2"
    Errors = Cell(MOLE_CSTR("x")) & vbLf & MoleReasons.ReasonAt("[Book]S!$B$2", 0, 0)
    MoleHost.CallFrom "[Book]S!$D$4"
    block = MOLE_PFR("x")
    Errors = Errors & vbLf & Cell(block(0, 0)) & vbLf & Cell(block(0, 1)) & vbLf & Cell(block(1, 0)) & vbLf & Cell(block(1, 1))
    Errors = Errors & vbLf & MoleReasons.ReasonAt("[Book]S!$D$4", 1, 1) & vbLf & MoleReasons.AllReasons("[Book]S!$D$4")
    MoleReasons.Forget "[Book]S!$D$4"
    Errors = Errors & "forgotten:" & MoleReasons.ReasonAt("[Book]S!$D$4", 1, 1) & MoleReasons.AllReasons("[Book]S!$D$4")
End Function

Public Function Lives(ByVal letters As String, ByVal calls As String) As String
    Dim i As Long
    MoleLibrary.Script letters
    MoleTransport.TryAgain
    MoleHost.CallFrom "[Book]S!$A$1"
    For i = 1 To CLng(calls)
        Lives = Lives & Cell(MOLE_CSTR(i)) & vbLf
    Next i
    Lives = Lives & "aside " & CStr(MoleTransport.IsAside()) & " " & MoleTransport.WhyAside() & vbLf & MoleLibrary.Commands_()
End Function

Public Function Reason() As String
    MoleLibrary.Script "sp"
    MoleHost.CallFrom "[Book]S!$A$1"
    Reason = Cell(MOLE_CSTR(1)) & vbLf & MoleReasons.ReasonAt("[Book]S!$A$1", 0, 0)
End Function

Public Function AsShown(ByVal result As String) As String
    AsShown = Cell(MoleReasons.Shown("[Book]S!$C$3", result)) & vbLf & MoleReasons.ReasonAt("[Book]S!$C$3", 0, 0)
End Function

Private Function KeptAs(ByVal home As String, ByVal formula As String) As String
    Dim answer As Variant
    KeptAs = "nothing"
    If MoleKept.IsKept(home, formula, answer) Then KeptAs = Cell(answer)
End Function

Public Function Kept() As String
    MoleKept.Keep "[B]S!$A$1", "=MOLE_CSTR(A1,B1)", 2.5
    MoleKept.Keep "[B]S!$A$2", "=100*MOLE_CSTR(A1,B1)", 2.5
    MoleKept.Keep "[B]S!$A$1", "=MOLE_CSTR(A1,B1)", 3.5
    Kept = KeptAs("[B]S!$A$1", "=MOLE_CSTR(A1,B1)") & vbLf & KeptAs("[B]S!$A$1", "=MOLE_CSTR(A1,B2)") & vbLf & _
        KeptAs("[B]S!$A$2", "=100*MOLE_CSTR(A1,B1)") & vbLf & KeptAs("[B]S!$A$3", "=MOLE_CSTR(A1,B1)")
    MoleKept.ForgetAll
    Kept = Kept & vbLf & KeptAs("[B]S!$A$1", "=MOLE_CSTR(A1,B1)")
End Function

Public Function Bare(ByVal formula As String) As String
    Bare = CStr(MoleKept.IsBareCall(formula))
End Function
