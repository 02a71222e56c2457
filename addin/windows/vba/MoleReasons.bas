Attribute VB_Name = "MoleReasons"
' Errors travel from Python as a text: mark, code, mark, reason. Here they become true errors, and the reasons are kept.
Option Explicit
Option Private Module

Private Const MARK_CODE As Long = 1
Private Const MOST As Long = 2000 ' reasons kept per formula

Private kept As Collection ' by cell of the formula: a Collection of reasons by place in its result

Public Function Marked(ByVal code As String, ByVal reason As String) As String
    Marked = Chr(MARK_CODE) & code & Chr(MARK_CODE) & reason
End Function

' The reason alone of a marked text; another text as it is.
Public Function Unmarked(ByVal text As String) As String
    Unmarked = text
    If IsMarked(text) Then Unmarked = Mid(text, InStr(2, text, Chr(MARK_CODE)) + 1)
End Function

' What stands for an argument that was left out.
Public Function LeftOut() As String
    LeftOut = Chr(MARK_CODE) & "left out"
End Function

' What the cells show for a result; the reasons of its errors are kept under the formula's cell.
Public Function Shown(ByVal home As String, ByVal result As Variant) As Variant
    Dim i As Long, j As Long
    Select Case Dimensions(result)
        Case 0
            Shown = OneCell(home, 0, 0, result)
            Exit Function
        Case 1
            For j = LBound(result) To UBound(result)
                If IsMarked(result(j)) Then result(j) = OneCell(home, 0, j - LBound(result), result(j))
            Next j
        Case Else
            For i = LBound(result, 1) To UBound(result, 1)
                For j = LBound(result, 2) To UBound(result, 2)
                    If IsMarked(result(i, j)) Then
                        result(i, j) = OneCell(home, i - LBound(result, 1), j - LBound(result, 2), result(i, j))
                    End If
                Next j
            Next i
    End Select
    Shown = result
End Function

' The reason for the cell at a row and column of a formula's result (0 = its first); "" if none is kept.
Public Function ReasonAt(ByVal home As String, ByVal row As Long, ByVal column As Long) As String
    On Error Resume Next
    ReasonAt = kept.Item(home).Item(Place(row, column))
End Function

' All reasons of a formula, each once.
Public Function AllReasons(ByVal home As String) As String
    Dim reasons As Collection, reason As Variant
    On Error Resume Next
    Set reasons = kept.Item(home)
    On Error GoTo 0
    If reasons Is Nothing Then Exit Function
    For Each reason In reasons
        If InStr(AllReasons, CStr(reason)) = 0 Then AllReasons = AllReasons & CStr(reason) & vbLf
    Next reason
End Function

Public Sub Forget(ByVal home As String)
    On Error Resume Next
    kept.Remove home
End Sub

Public Function ErrorNumber(ByVal code As String) As Long
    Select Case code
        Case "#NULL!": ErrorNumber = 2000
        Case "#DIV/0!": ErrorNumber = 2007
        Case "#REF!": ErrorNumber = 2023
        Case "#NAME?": ErrorNumber = 2029
        Case "#NUM!": ErrorNumber = 2036
        Case "#N/A": ErrorNumber = 2042
        Case "#GETTING_DATA": ErrorNumber = 2043
        Case "#SPILL!": ErrorNumber = 2045
        Case "#CONNECT!": ErrorNumber = 2046
        Case "#BLOCKED!": ErrorNumber = 2047
        Case "#UNKNOWN!": ErrorNumber = 2048
        Case "#FIELD!": ErrorNumber = 2049
        Case "#CALC!": ErrorNumber = 2050
        Case Else: ErrorNumber = 2015
    End Select
End Function

Private Function OneCell(ByVal home As String, ByVal row As Long, ByVal column As Long, ByVal value As Variant) As Variant
    Dim border As Long
    If Not IsMarked(value) Then
        OneCell = value
        Exit Function
    End If
    border = InStr(2, value, Chr(MARK_CODE))
    Keep home, Place(row, column), Mid(value, border + 1)
    OneCell = CVErr(ErrorNumber(Mid(value, 2, border - 2)))
End Function

Private Function IsMarked(ByVal value As Variant) As Boolean
    If VarType(value) = vbString Then IsMarked = (Left(value, 1) = Chr(MARK_CODE))
End Function

Private Sub Keep(ByVal home As String, ByVal at As String, ByVal reason As String)
    Dim reasons As Collection
    If kept Is Nothing Then Set kept = New Collection
    On Error Resume Next
    Set reasons = kept.Item(home)
    If reasons Is Nothing Then
        Set reasons = New Collection
        kept.Add reasons, home
    End If
    reasons.Remove at
    If reasons.Count < MOST Then reasons.Add reason, at
End Sub

Private Function Place(ByVal row As Long, ByVal column As Long) As String
    Place = "R" & CStr(row) & "C" & CStr(column)
End Function

Public Function Dimensions(ByVal value As Variant) As Long
    Dim bound As Long
    If Not IsArray(value) Then Exit Function
    Dimensions = 1
    On Error GoTo OneDimension
    bound = UBound(value, 2)
    Dimensions = 2
OneDimension:
End Function
