Attribute VB_Name = "MoleFunctions"
' Made from the table of worksheet functions by addin/windows/build.py: do not edit.
Option Explicit

Public Function MOLE_CSTR(ByVal reactions As Variant, Optional ByVal feed As Variant, Optional ByVal reactor As Variant, Optional ByVal want As Variant, Optional ByVal constants As Variant) As Variant
    Dim sent() As Variant
    ReDim sent(0 To 4)
    MoleCalls.Place sent, 0, reactions
    MoleCalls.Place sent, 1, feed
    MoleCalls.Place sent, 2, reactor
    MoleCalls.Place sent, 3, want
    MoleCalls.Place sent, 4, constants
    MOLE_CSTR = MoleCalls.Answered("MOLE_CSTR", sent)
End Function

Public Function MOLE_PFR(ByVal reactions As Variant, Optional ByVal feed As Variant, Optional ByVal reactor As Variant, Optional ByVal want As Variant, Optional ByVal constants As Variant) As Variant
    Dim sent() As Variant
    ReDim sent(0 To 4)
    MoleCalls.Place sent, 0, reactions
    MoleCalls.Place sent, 1, feed
    MoleCalls.Place sent, 2, reactor
    MoleCalls.Place sent, 3, want
    MoleCalls.Place sent, 4, constants
    MOLE_PFR = MoleCalls.Answered("MOLE_PFR", sent)
End Function

Public Function MOLE_PROFILE(ByVal reactions As Variant, Optional ByVal feed As Variant, Optional ByVal reactor As Variant, Optional ByVal points As Variant, Optional ByVal want As Variant, Optional ByVal constants As Variant) As Variant
    Dim sent() As Variant
    ReDim sent(0 To 5)
    MoleCalls.Place sent, 0, reactions
    MoleCalls.Place sent, 1, feed
    MoleCalls.Place sent, 2, reactor
    MoleCalls.Place sent, 3, points
    MoleCalls.Place sent, 4, want
    MoleCalls.Place sent, 5, constants
    MOLE_PROFILE = MoleCalls.Answered("MOLE_PROFILE", sent)
End Function

Public Function MOLE_RATES(ByVal reactions As Variant, Optional ByVal at As Variant, Optional ByVal reactor As Variant, Optional ByVal constants As Variant) As Variant
    Dim sent() As Variant
    ReDim sent(0 To 3)
    MoleCalls.Place sent, 0, reactions
    MoleCalls.Place sent, 1, at
    MoleCalls.Place sent, 2, reactor
    MoleCalls.Place sent, 3, constants
    MOLE_RATES = MoleCalls.Answered("MOLE_RATES", sent)
End Function

Public Function MOLE_AUDIT(ByVal function_ As Variant, ParamArray arguments() As Variant) As Variant
    Dim sent() As Variant, i As Long
    ReDim sent(0 To UBound(arguments) + 1)
    MoleCalls.Place sent, 0, function_
    For i = 0 To UBound(arguments)
        MoleCalls.Place sent, i + 1, arguments(i)
    Next i
    MOLE_AUDIT = MoleCalls.Answered("MOLE_AUDIT", sent)
End Function
