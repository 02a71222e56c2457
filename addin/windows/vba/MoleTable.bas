Attribute VB_Name = "MoleTable"
' Made from the table of worksheet functions by addin/windows/build.py: do not edit.
Option Explicit
Option Private Module

Public Const CATEGORY As String = "Reactor balances"

Public Function Names() As Variant
    Names = Array("MOLE_CSTR", "MOLE_PFR", "MOLE_PROFILE", "MOLE_RATES", "MOLE_AUDIT")
End Function

Public Function Signature(ByVal functionName As String) As Variant
    Select Case functionName
        Case "MOLE_CSTR"
            Signature = "MOLE_CSTR(reactions, feed, reactor, [want], [constants])"
        Case "MOLE_PFR"
            Signature = "MOLE_PFR(reactions, feed, reactor, [want], [constants])"
        Case "MOLE_PROFILE"
            Signature = "MOLE_PROFILE(reactions, feed, reactor, [points], [want], [constants])"
        Case "MOLE_RATES"
            Signature = "MOLE_RATES(reactions, at, [reactor], [constants])"
        Case "MOLE_AUDIT"
            Signature = "MOLE_AUDIT(function, arguments, ...)"
    End Select
End Function

Public Function Summary(ByVal functionName As String) As Variant
    Select Case functionName
        Case "MOLE_CSTR"
            Summary = "Outlet of a stirred tank (CSTR) at steady state."
        Case "MOLE_PFR"
            Summary = "Outlet of a plug-flow tube (PFR) at steady state."
        Case "MOLE_PROFILE"
            Summary = "Concentrations along a plug-flow tube."
        Case "MOLE_RATES"
            Summary = "Rates of the reactions and of the species at given concentrations."
        Case "MOLE_AUDIT"
            Summary = "What was read, assumed, checked and found doubtful in a call, verdict first."
    End Select
End Function

Public Function Result(ByVal functionName As String) As Variant
    Select Case functionName
        Case "MOLE_CSTR"
            Result = "A column in feed order, or the shape of want; several cases: a row per case"
        Case "MOLE_PFR"
            Result = "A column in feed order, or the shape of want; several cases: a row per case"
        Case "MOLE_PROFILE"
            Result = "A header row and a row per point: tau, volume or catalyst mass, then species or wants"
        Case "MOLE_RATES"
            Result = "A header row, then a row per reaction and a row per species: name, rate"
        Case "MOLE_AUDIT"
            Result = "Rows of level (stop, doubt, note, fine), where, what and what to do"
    End Select
End Function

Public Function ArgumentNames(ByVal functionName As String) As Variant
    Select Case functionName
        Case "MOLE_CSTR"
            ArgumentNames = Array( _
                "reactions", _
                "feed", _
                "reactor", _
                "want", _
                "constants")
        Case "MOLE_PFR"
            ArgumentNames = Array( _
                "reactions", _
                "feed", _
                "reactor", _
                "want", _
                "constants")
        Case "MOLE_PROFILE"
            ArgumentNames = Array( _
                "reactions", _
                "feed", _
                "reactor", _
                "points", _
                "want", _
                "constants")
        Case "MOLE_RATES"
            ArgumentNames = Array( _
                "reactions", _
                "at", _
                "reactor", _
                "constants")
        Case "MOLE_AUDIT"
            ArgumentNames = Array( _
                "function", _
                "arguments")
    End Select
End Function

Public Function ArgumentHelp(ByVal functionName As String) As Variant
    Select Case functionName
        Case "MOLE_CSTR"
            ArgumentHelp = Array( _
                "Reactions table, or one species-and-reaction table, with its header row", _
                "Feed table: species and their feed; leave empty if the first table holds it", _
                "Residence time, a range of them, a block of label | value | unit, or a table of cases", _
                "What to return, such as Mono/Di or 100*conversion(Ox); default: every species", _
                "Constants shared by the rate laws: name, value, unit, E or dH, T ref")
        Case "MOLE_PFR"
            ArgumentHelp = Array( _
                "Reactions table, or one species-and-reaction table, with its header row", _
                "Feed table: species and their feed; leave empty if the first table holds it", _
                "Residence time, a range of them, a block of label | value | unit, or a table of cases", _
                "What to return, such as Mono/Di or 100*conversion(Ox); default: every species", _
                "Constants shared by the rate laws: name, value, unit, E or dH, T ref")
        Case "MOLE_PROFILE"
            ArgumentHelp = Array( _
                "Reactions table, or one species-and-reaction table, with its header row", _
                "Feed table: species and their feed; leave empty if the first table holds it", _
                "Residence time, a range of them, a block of label | value | unit, or a table of cases", _
                "Number of rows below the header, default 51", _
                "What to return, such as Mono/Di or 100*conversion(Ox); default: every species", _
                "Constants shared by the rate laws: name, value, unit, E or dH, T ref")
        Case "MOLE_RATES"
            ArgumentHelp = Array( _
                "Reactions table, or one species-and-reaction table, with its header row", _
                "Feed table with the concentrations at which the rates are wanted", _
                "Block with the temperature, where a rate law needs one", _
                "Constants shared by the rate laws: name, value, unit, E or dH, T ref")
        Case "MOLE_AUDIT"
            ArgumentHelp = Array( _
                "Which function to audit: ""CSTR"", ""PFR"", ""PROFILE"" or ""RATES""", _
                "The arguments of that function, in its order")
    End Select
End Function
