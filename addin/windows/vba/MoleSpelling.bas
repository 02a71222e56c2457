Attribute VB_Name = "MoleSpelling"
' The name of our functions as files spell it, brought back to the bare name.
Option Explicit
Option Private Module

' A formula with every call of ours under its bare name: no path of an add-in, no [n]!, no _xldudf_, no _xll.
Public Function OwnSpelling(ByVal formula As String) As String
    Dim at As Long, after As Long, letter As String
    at = 1
    Do While at <= Len(formula)
        letter = Mid(formula, at, 1)
        If letter = Chr(34) Then
            after = AfterQuoted(formula, at)
            OwnSpelling = OwnSpelling & Mid(formula, at, after - at)
        ElseIf IsStart(formula, at) Then
            If IsOwnCall(formula, AfterOwner(formula, at)) Then at = AfterOwner(formula, at)
            after = AfterWord(formula, at)
            OwnSpelling = OwnSpelling & Mid(formula, at, after - at)
        Else
            OwnSpelling = OwnSpelling & letter
            after = at + 1
        End If
        at = after
    Loop
End Function

' True where a name or an owner's name can begin.
Private Function IsStart(ByVal formula As String, ByVal at As Long) As Boolean
    IsStart = (InStr("'[_", Mid(formula, at, 1)) > 0 Or IsWord(Mid(formula, at, 1)))
End Function

Private Function IsWord(ByVal letter As String) As Boolean
    Select Case AscW(letter)
        Case 48 To 57, 65 To 90, 97 To 122, Is > 127, Is < 0 ' AscW is negative above 32767
            IsWord = True
        Case Else
            IsWord = (InStr("_.\", letter) > 0)
    End Select
End Function

' The place behind everything that says whose function it is; `at` itself if there is nothing.
Private Function AfterOwner(ByVal formula As String, ByVal at As Long) As Long
    Dim mark As Variant, after As Long
    after = at
    If Mid(formula, at, 1) = "'" Then
        after = AfterQuoted(formula, at)
    ElseIf Mid(formula, at, 1) = "[" Then
        after = InStr(at, formula, "]") + 1
        If after = 1 Then after = at
        after = AfterWord(formula, after, True)
    Else
        after = AfterWord(formula, at, True)
    End If
    If after > at And Mid(formula, after, 1) = "!" Then at = after + 1
    For Each mark In Array("_xlfn.", "_xll.", "_xldudf_", "_xludf.")
        If StrComp(Mid(formula, at, Len(mark)), mark, vbTextCompare) = 0 Then at = at + Len(mark)
    Next mark
    AfterOwner = at
End Function

Private Function IsOwnCall(ByVal formula As String, ByVal at As Long) As Boolean
    Dim name As Variant
    For Each name In MoleTable.Names()
        If StrComp(Mid(formula, at, Len(name) + 1), name & "(", vbTextCompare) = 0 Then IsOwnCall = True
    Next name
End Function

' The place behind a quoted text or sheet name that begins at `at`; a doubled quote belongs to it.
Public Function AfterQuoted(ByVal formula As String, ByVal at As Long) As Long
    Dim quote As String
    quote = Mid(formula, at, 1)
    at = at + 1
    Do While at <= Len(formula)
        If Mid(formula, at, 1) <> quote Then
            at = at + 1
        ElseIf Mid(formula, at + 1, 1) = quote Then
            at = at + 2
        Else
            AfterQuoted = at + 1
            Exit Function
        End If
    Loop
    AfterQuoted = at
End Function

' The place behind a name, or at least behind one character unless `mayBeEmpty`.
Private Function AfterWord(ByVal formula As String, ByVal at As Long, Optional ByVal mayBeEmpty As Boolean = False) As Long
    Dim start As Long
    start = at
    If Mid(formula, at, 1) = "'" And Not mayBeEmpty Then
        AfterWord = AfterQuoted(formula, at)
        Exit Function
    End If
    Do While at <= Len(formula)
        If Not IsWord(Mid(formula, at, 1)) Then Exit Do
        at = at + 1
    Loop
    If at = start And Not mayBeEmpty Then at = at + 1
    AfterWord = at
End Function
