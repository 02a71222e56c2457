Attribute VB_Name = "MoleTransport"
' One Python process for all workbooks: started on first use, replaced when it ended, set aside when it can't be had.
Option Explicit
Option Private Module

Private asideBecause As String
Private starts As Long

' Hands a call to Python. False if there is no service: the cell has to keep what it shows.
Public Function Sent(ByVal name As String, ByVal arguments As Variant, ByRef result As Variant) As Boolean
    Dim attempt As Long, number As Long, words As String
    For attempt = 1 To 2
        If Not Ready() Then Exit Function
        If MoleLibrary.Asked(name, arguments, result, number, words) Then
            Sent = True
            Exit Function
        End If
        If Not IsLost(number) Then
            result = MoleReasons.Marked("#VALUE!", name & ": Python answered with an error, please report it: " & words)
            Sent = True
            Exit Function
        End If
        MoleLibrary.LetGo
    Next attempt
    SetAside "Python ended twice while it answered " & name & "."
End Function

Public Function IsAside() As Boolean
    IsAside = (asideBecause <> "")
End Function

Public Function WhyAside() As String
    WhyAside = asideBecause
End Function

' Looks for the files that a start needs, before any cell asks: a book that opens then keeps its values.
Public Sub LookFirst()
    Dim problem As String
    problem = MoleSettings.Broken()
    If problem <> "" Then SetAside problem
End Sub

' Forgets that the service was missing: the next call tries again.
Public Sub TryAgain()
    asideBecause = ""
End Sub

Public Sub Finish()
    MoleLibrary.LetGo
End Sub

Private Function Ready() As Boolean
    Dim problem As String
    If MoleLibrary.IsConnected() Then
        Ready = True
        Exit Function
    End If
    If IsAside() Then Exit Function
    problem = MoleSettings.Broken()
    If problem = "" Then problem = StartProblem()
    If problem = "" Then Ready = True Else SetAside problem
End Function

' The DLL never replaces a process that ended under the same command: the number of the start makes it a new one.
Private Function StartProblem() As String
    Dim problem As String
    starts = starts + 1
    MoleHost.ShowStatus "moletally starts Python, once: this may take up to 30 seconds"
    If Not MoleLibrary.Started(MoleSettings.LibraryFile(), MoleSettings.StartCommand(MoleSettings.PythonFile(), starts), problem) Then
        StartProblem = MoleSettings.StartFailure(problem)
    End If
    MoleHost.ShowStatus ""
End Function

Private Sub SetAside(ByVal because As String)
    asideBecause = because
    MoleAside.Begin
End Sub

' Errors that say the process is gone, as VBA and as COM number them.
Private Function IsLost(ByVal number As Long) As Boolean
    Select Case number
        Case 462, -2147023174, -2147023170, -2147023169, -2147417848, -2147417842
            IsLost = True
    End Select
End Function
