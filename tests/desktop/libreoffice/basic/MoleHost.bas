Attribute VB_Name = "MoleHost"
' Stand-in for the module that needs Excel: the calling cell is set by the scenario, the status text is noted.
Option Explicit

Private callingCell As String
Private statusTexts As String

Public Sub CallFrom(ByVal cell As String)
    callingCell = cell
End Sub

Public Function Home() As String
    Home = callingCell
End Function

Public Function RangeRead(ByVal source As Object, ByRef values As Variant, ByRef problem As String) As Boolean
    problem = "this is several ranges; give one range"
End Function

Public Sub ShowStatus(ByVal text As String)
    statusTexts = statusTexts & text & "/"
End Sub

Public Function StatusTexts_() As String
    StatusTexts_ = statusTexts
End Function

Public Function Formula() As String
    Formula = "=MOLE_CSTR(A1)"
End Function
