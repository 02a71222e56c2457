Attribute VB_Name = "MoleCopy"
' A copy for people without the add-in: our formulas hold their values, everything else stays as it is.
Option Explicit
Option Private Module

Public Sub HandOver(ByVal book As Workbook)
    Dim target As Variant, stem As String, copy As Workbook, count As Long
    If book.Path = "" Then
        MsgBox "Save the book first: the copy is made from its file.", vbInformation, "moletally"
        Exit Sub
    End If
    stem = Left(book.Name, InStrRev(book.Name, ".") - 1)
    target = Application.GetSaveAsFilename(stem & " - values" & Mid(book.Name, InStrRev(book.Name, ".")), , , "Copy for people without moletally")
    If VarType(target) = vbBoolean Then Exit Sub
    If StrComp(target, book.FullName, vbTextCompare) = 0 Then
        MsgBox "Choose another name than the book's own: this one stays live.", vbExclamation, "moletally"
        Exit Sub
    End If
    On Error GoTo Failed
    book.SaveCopyAs target
    Application.EnableEvents = False ' the copy is not to be adopted
    Set copy = Application.Workbooks.Open(target, UpdateLinks:=0)
    count = ValuesInPlace(book, copy)
    DropLinks copy
    copy.Close SaveChanges:=True
    Application.EnableEvents = True
    MsgBox CStr(count) & " formulas hold their values in " & target & ".", vbInformation, "moletally"
    Exit Sub
Failed:
    Application.EnableEvents = True
    MsgBox "The copy could not be made: " & Err.Description, vbExclamation, "moletally"
    If Not copy Is Nothing Then copy.Close SaveChanges:=False
End Sub

' The values are those that the live book shows, so that no calculation in the copy can change them.
Private Function ValuesInPlace(ByVal book As Workbook, ByVal copy As Workbook) As Long
    Dim cell As Variant, source As Range, place As Range
    For Each cell In MoleBook.OwnCells(book)
        Set source = cell
        If MoleBook.IsFixedArray(cell) Then Set source = cell.CurrentArray Else Set source = MoleBook.SpillOf(cell)
        Set place = copy.Worksheets(cell.Worksheet.Name).Range(source.Address)
        place.ClearContents
        place.Value2 = source.Value2
        ValuesInPlace = ValuesInPlace + 1
    Next cell
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
