Attribute VB_Name = "MoleLibrary"
' Stand-in for the module that starts Python: a script of letters says what happens, one letter a start or a call.
'   starts   s = it starts, x = it can't be started
'   calls    e = echo of name and arguments, m = a marked error, b = a block with a marked error, d = Python ended, p = Python raised
Option Explicit

Private steps As String
Private connected As Boolean
Private commands As String

Public Sub Script(ByVal letters As String)
    steps = letters
    connected = False
    commands = ""
End Sub

Public Function Commands_() As String
    Commands_ = commands
End Function

Private Function NextStep() As String
    NextStep = Left(steps, 1)
    steps = Mid(steps, 2)
End Function

Public Function LibraryKey() As String
    LibraryKey = "dll64"
End Function

Public Function IsConnected() As Boolean
    IsConnected = connected
End Function

Public Function Started(ByVal library As String, ByVal startCommand As String, ByRef problem As String) As Boolean
    commands = commands & startCommand & "|"
    connected = (NextStep() = "s")
    If Not connected Then problem = "the DLL says no"
    Started = connected
End Function

Public Function Asked(ByVal name As String, ByVal arguments As Variant, ByRef result As Variant, ByRef number As Long, ByRef words As String) As Boolean
    Dim block(0 To 1, 0 To 1) As Variant
    Asked = True
    Select Case NextStep()
        Case "e"
            result = name & Echo(arguments)
        Case "m"
            result = MoleReasons.Marked("#NUM!", "keeps oscillating")
        Case "b"
            block(0, 0) = 1.5
            block(0, 1) = "text"
            block(1, 0) = MoleReasons.Marked("#VALUE!", "row 2: unit")
            block(1, 1) = MoleReasons.Marked("#N/A", "0/0")
            result = block
        Case "d"
            Asked = False
            number = -2147023174
            words = "The RPC server is unavailable."
        Case "p"
            Asked = False
            number = -2147467259
            words = "ValueError: nothing"
    End Select
End Function

Public Sub LetGo()
    connected = False
End Sub

Private Function Echo(ByVal arguments As Variant) As String
    Dim i As Long
    For i = LBound(arguments) To UBound(arguments)
        If IsArray(arguments(i)) Then
            Echo = Echo & "|array " & CStr(UBound(arguments(i), 1)) & "x" & CStr(UBound(arguments(i), 2)) & " " & CStr(arguments(i)(1, 1))
        ElseIf CStr(arguments(i)) = MoleReasons.LeftOut() Then
            Echo = Echo & "|left out"
        ElseIf IsEmpty(arguments(i)) Then
            Echo = Echo & "|empty"
        Else
            Echo = Echo & "|" & TypeName(arguments(i)) & " " & CStr(arguments(i))
        End If
    Next i
End Function
