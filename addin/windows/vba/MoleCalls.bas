Attribute VB_Name = "MoleCalls"
' The way of a call from a cell: ranges are read, Python is asked, errors become true errors.
Option Explicit
Option Private Module

' Puts an argument in its place; one that was left out is marked, as it is neither empty nor 0.
Public Sub Place(ByRef sent() As Variant, ByVal i As Long, Optional ByRef value As Variant)
    If IsMissing(value) Then
        sent(i) = MoleReasons.LeftOut()
    ElseIf IsObject(value) Then
        Set sent(i) = value
    Else
        sent(i) = value
    End If
End Sub

Public Function Answered(ByVal name As String, ByVal arguments As Variant) As Variant
    Dim home As String, sent() As Variant, problem As String, result As Variant
    On Error GoTo Failed
    home = MoleHost.Home()
    If Not Gathered(name, arguments, sent, problem) Then
        result = MoleReasons.Marked("#VALUE!", problem)
    ElseIf MoleTransport.Sent(name, sent, result) Then
        MoleAudit.Note home, name, sent
    Else
        Answered = MoleAside.LastValue(home)
        Exit Function
    End If
    result = MoleReasons.Shown(home, result)
    MoleKept.Keep home, MoleHost.Formula(), result
    Answered = result
    Exit Function
Failed:
    Answered = MoleReasons.Shown(home, MoleReasons.Marked("#VALUE!", name & " could not be asked: " & Err.Description))
End Function

' Arguments as values: each range becomes an array, what was left out stays left out.
Private Function Gathered(ByVal name As String, ByVal arguments As Variant, ByRef sent() As Variant, ByRef problem As String) As Boolean
    Dim i As Long, values As Variant
    ReDim sent(LBound(arguments) To UBound(arguments))
    For i = LBound(arguments) To UBound(arguments)
        If IsObject(arguments(i)) Then
            If Not MoleHost.RangeRead(arguments(i), values, problem) Then
                problem = name & ", argument " & CStr(i - LBound(arguments) + 1) & ": " & problem
                Exit Function
            End If
            sent(i) = values
        Else
            sent(i) = arguments(i)
        End If
    Next i
    Gathered = True
End Function
