Attribute VB_Name = "MoleCopy"
' A copy for people without the add-in: our formulas hold their values, everything else stays as it is.
Option Explicit
Option Private Module

Public Sub HandOver(ByVal book As Workbook)
    Dim target As Variant, stem As String, own As Collection, refusal As String
    Set own = MoleBook.OwnCells(book)
    If book.Path = "" Then
        refusal = "Save the book first: the copy takes its name and kind from the file."
    ElseIf own.Count = 0 Then
        refusal = "There is no formula of moletally in " & book.Name & ": it can be handed over as it is."
    ElseIf MoleBook.IsProtected(own) Then
        refusal = "A sheet with formulas of moletally is protected: unprotect it, or its formulas can't be replaced in the copy."
    End If
    If refusal = "" Then
        stem = Left(book.Name, InStrRev(book.Name, ".") - 1)
        target = Application.GetSaveAsFilename(stem & " - values" & Mid(book.Name, InStrRev(book.Name, ".")), , , "Copy for people without moletally")
        If VarType(target) = vbBoolean Then Exit Sub
        refusal = WhyNot(CStr(target), book)
    End If
    If refusal = "" Then
        WriteCopy book, own, CStr(target)
    Else
        MsgBox refusal, vbExclamation, "moletally"
    End If
End Sub

' What speaks against a name for the copy; "" if nothing does.
Private Function WhyNot(ByVal target As String, ByVal book As Workbook) As String
    If StrComp(Mid(target, InStrRev(target, "\") + 1), book.Name, vbTextCompare) = 0 Then
        WhyNot = "Choose another name than that of the book: Excel can't have two of one name open."
    ElseIf MoleSettings.FileThere(target) Then
        WhyNot = target & " exists: choose another name, or delete it first."
    End If
End Function

Private Sub WriteCopy(ByVal book As Workbook, ByVal own As Collection, ByVal target As String)
    Dim copy As Workbook, count As Long, problem As String
    On Error GoTo Failed
    book.SaveCopyAs target
    Application.EnableEvents = False ' the copy is not to be adopted
    Set copy = Application.Workbooks.Open(target, UpdateLinks:=0)
    count = ValuesInPlace(own, copy)
    DropLinks copy
    copy.Close SaveChanges:=True
    Application.EnableEvents = True
    MsgBox CStr(count) & " formulas hold their values in " & target & ".", vbInformation, "moletally"
    Exit Sub
Failed:
    problem = Err.Description
    Application.EnableEvents = True
    Application.CutCopyMode = False
    Discard copy, target
    MsgBox "The copy could not be made: " & problem, vbExclamation, "moletally"
End Sub

' A copy that is not finished still holds formulas: it must not be taken for one that is.
Private Sub Discard(ByVal copy As Workbook, ByVal target As String)
    On Error Resume Next ' it may not have come so far
    If Not copy Is Nothing Then copy.Close SaveChanges:=False
    Kill target
End Sub

' The values are those that the live book shows, so that no calculation in the copy can change them. They are
' pasted, since a text that is written would be read as if it were typed.
Private Function ValuesInPlace(ByVal own As Collection, ByVal copy As Workbook) As Long
    Dim cell As Variant, source As Range, place As Range
    For Each cell In own
        Set source = MoleBook.SpillOf(MoleBook.WholeOf(cell))
        Set place = copy.Worksheets(cell.Worksheet.Name).Range(source.Address)
        place.ClearContents
        source.Copy
        place.PasteSpecial xlPasteValues
        ValuesInPlace = ValuesInPlace + 1
    Next cell
    Application.CutCopyMode = False
End Function

' The copy shall not ask for an add-in that its reader does not have.
Private Sub DropLinks(ByVal copy As Workbook)
    Dim links As Variant, link As Variant
    links = copy.LinkSources(xlExcelLinks)
    If IsEmpty(links) Then Exit Sub
    On Error Resume Next ' a link that stays does no harm to the values
    For Each link In links
        If InStr(1, link, ThisWorkbook.Name, vbTextCompare) > 0 Then copy.BreakLink link, xlLinkTypeExcelLinks
    Next link
End Sub
