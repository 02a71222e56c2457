Attribute VB_Name = "MoleSheets"
' Scenarios on a real sheet, with the real module that reads ranges: the add-in's own sheet of settings.
Option Explicit

Private Function Sheet() As Object
    Set Sheet = ThisWorkbook.Worksheets("Settings")
End Function

Private Function ReadAs(ByVal address As String) As String
    Dim values As Variant, problem As String
    If Not MoleHost.RangeRead(Sheet().Range(address), values, problem) Then
        ReadAs = problem
    Else
        ReadAs = CStr(UBound(values, 1)) & "x" & CStr(UBound(values, 2)) & " " & TypeName(values(1, 1)) & " " & CStr(values(1, 1))
    End If
End Function

Public Function Ranges() As String
    Sheet().Range("A4").Value = 0.00003217
    Sheet().Range("B4").Value = "text"
    Ranges = ReadAs("A1:B2") & vbLf & ReadAs("A:C") & vbLf & ReadAs("2:9") & vbLf & ReadAs("A4") & vbLf & ReadAs("B4") & vbLf & _
        ReadAs("B3") & vbLf & ReadAs("Z99") & vbLf & ReadAs("A1:A2,B1:B2")
End Function
