Attribute VB_Name = "MoleSettings"
' What `moletally excel install` wrote for this user, the checks before a start, and the command line of the start.
' Nothing is read from a workbook that is opened: a foreign file must not choose which program runs.
Option Explicit
Option Private Module

Public Const OWN_VERSION As String = "{moletally}"
Public Const DLL_VERSION As String = "{xlwings}"
Private Const MEND As String = " Run: moletally excel install"
Private Const LONGEST As Long = 2000 ' characters; the DLL has room for 2048

Private settingsText As String
Private isRead As Boolean

' "" if all files that a start needs are there and belong together; else what is wrong and what to do.
Public Function Broken() As String
    isRead = False
    If Not FileThere(SettingsFile()) Then
        Broken = "moletally is not installed for you on this computer: " & SettingsFile() & " is missing." & MEND
    ElseIf Setting("moletally") <> OWN_VERSION Then
        Broken = "This macro file is moletally " & OWN_VERSION & ", the Python part is " & Setting("moletally") & "." & MEND
    ElseIf Setting("xlwings") <> DLL_VERSION Then
        Broken = "This macro file was made for xlwings " & DLL_VERSION & ", installed is " & Setting("xlwings") & "." & MEND
    ElseIf Not FileThere(PythonFile()) Then
        Broken = "Python is missing: " & PythonFile() & " does not exist. Install Python and moletally again, then run: moletally excel install"
    ElseIf Not FileThere(LibraryFile()) Then
        Broken = "The library that starts Python is missing: " & LibraryFile() & "." & MEND
    ElseIf Len(StartCommand(PythonFile(), 1)) > LONGEST Then
        Broken = "The path of Python is too long: install it in a folder with a shorter name." & MEND
    End If
End Function

Public Function PythonFile() As String
    PythonFile = Setting("python")
End Function

Public Function LibraryFile() As String
    LibraryFile = Setting(MoleLibrary.LibraryKey())
End Function

' $(CLSID) is filled in by the DLL.
Public Function StartCommand(ByVal python As String, ByVal start As Long) As String
    StartCommand = Chr(34) & python & Chr(34) & " -P -m moletally.hosts.windows.serve $(CLSID) " & CStr(start)
End Function

' Why a start failed: in the words of the Python side if it came so far, else of the DLL.
Public Function StartFailure(ByVal words As String) As String
    Dim lines As Variant, i As Long, found As Long
    StartFailure = "Python can't be started: " & words
    If FileThere(LogFile()) Then
        lines = Split(ReadText(LogFile()), vbLf)
        For i = LBound(lines) To UBound(lines)
            found = InStr(lines(i), " failed: ")
            If found > 0 Then StartFailure = "Python can't be started: " & Trim(Replace(Mid(lines(i), found + 9), vbCr, ""))
        Next i
    End If
    StartFailure = StartFailure & vbLf & "To see what is broken, run: moletally excel status"
End Function

Public Function SettingsFile() As String
    SettingsFile = Environ("LOCALAPPDATA") & "\moletally\excel.conf"
End Function

Public Function LogFile() As String
    LogFile = Environ("LOCALAPPDATA") & "\moletally\server.log"
End Function

Public Function Setting(ByVal key As String) As String
    If Not isRead Then
        settingsText = ReadText(SettingsFile())
        isRead = True
    End If
    Setting = ValueOf(settingsText, key)
End Function

' The value in a text of lines "key = value"; "" if it is not there.
Public Function ValueOf(ByVal text As String, ByVal key As String) As String
    Dim lines As Variant, i As Long, equals As Long
    lines = Split(Replace(text, vbCr, ""), vbLf)
    For i = LBound(lines) To UBound(lines)
        equals = InStr(lines(i), "=")
        If equals > 1 And Left(lines(i), 1) <> "#" Then
            If Trim(Left(lines(i), equals - 1)) = key Then ValueOf = Trim(Mid(lines(i), equals + 1))
        End If
    Next i
End Function

Public Function FileThere(ByVal path As String) As Boolean
    On Error GoTo Missing
    If path <> "" Then FileThere = ((GetAttr(path) And vbDirectory) = 0)
Missing:
End Function

Private Function ReadText(ByVal path As String) As String
    Dim number As Integer, text As String
    If Not FileThere(path) Then Exit Function
    number = FreeFile
    Open path For Input As #number
    Do While Not EOF(number)
        Line Input #number, text
        ReadText = ReadText & text & vbLf
    Loop
    Close #number
End Function
