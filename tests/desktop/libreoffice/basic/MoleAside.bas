Attribute VB_Name = "MoleAside"
' Stand-in for the module that needs Excel: a cell without a service shows "last value".
Option Explicit

Private begun As Long

Public Sub Begin()
    begun = begun + 1
End Sub

Public Function Begun_() As Long
    Begun_ = begun
End Function

Public Function LastValue(ByVal home As String) As Variant
    LastValue = "last value"
End Function
