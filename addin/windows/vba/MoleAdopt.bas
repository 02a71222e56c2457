Attribute VB_Name = "MoleAdopt"
' A workbook from a colleague, another folder or another host: its links to the add-in are repaired and formulas
' in another spelling are entered again, after one question per book. Protected and read-only books are left alone.
Option Explicit
Option Private Module

Private asked As Collection

Public Sub Adopt(ByVal book As Workbook)
    Dim links As Collection, cells As Collection
    If MoleTransport.IsAside() Then Exit Sub ' a formula that is entered again would lose its value
    If book.IsAddin Or book.ReadOnly Or WasAsked(book) Then Exit Sub
    Set links = OldLinks(book)
    Set cells = CellsToEnter(book)
    If links.Count + cells.Count = 0 Then Exit Sub
    If IsProtected(book) Then Exit Sub
    asked.Add book.FullName, book.FullName
    If MsgBox("The formulas of moletally in " & book.Name & " were stored for another place or host." & vbLf & vbLf & _
        "Connect them to the add-in on this computer?", vbQuestion + vbYesNo, "moletally") = vbYes Then
        Repair book, links, cells
    End If
End Sub

Private Function WasAsked(ByVal book As Workbook) As Boolean
    Dim known As String
    If asked Is Nothing Then Set asked = New Collection
    On Error Resume Next
    known = asked.Item(book.FullName)
    WasAsked = (known <> "")
End Function

Private Function IsProtected(ByVal book As Workbook) As Boolean
    Dim sheet As Worksheet
    IsProtected = book.ProtectStructure
    For Each sheet In book.Worksheets
        If sheet.ProtectContents Then IsProtected = True
    Next sheet
End Function

' Links to a file of the add-in's name that is not this one.
Private Function OldLinks(ByVal book As Workbook) As Collection
    Dim links As Variant, link As Variant, found As Collection
    Set found = New Collection
    Set OldLinks = found
    links = book.LinkSources(xlExcelLinks)
    If IsEmpty(links) Then Exit Function
    For Each link In links
        If IsOldLink(CStr(link), ThisWorkbook.Name, ThisWorkbook.FullName) Then found.Add CStr(link)
    Next link
End Function

Public Function IsOldLink(ByVal link As String, ByVal ownName As String, ByVal ownPath As String) As Boolean
    Dim name As String
    name = Mid(link, InStrRev(Replace(link, "/", "\"), "\") + 1)
    IsOldLink = (StrComp(name, ownName, vbTextCompare) = 0) And (StrComp(link, ownPath, vbTextCompare) <> 0)
End Function

' Cells of ours in another spelling, or that Excel could not connect when it opened the book.
Private Function CellsToEnter(ByVal book As Workbook) As Collection
    Dim cell As Variant, formula As String, found As Collection
    Set found = New Collection
    For Each cell In MoleBook.OwnCells(book)
        formula = MoleBook.FormulaOf(cell)
        If MoleSpelling.OwnSpelling(formula) <> formula Or IsUnknownName(cell) Then found.Add cell
    Next cell
    Set CellsToEnter = found
End Function

Private Function IsUnknownName(ByVal cell As Range) As Boolean
    If IsError(cell.Value) Then IsUnknownName = (cell.Value = CVErr(xlErrName))
End Function

Private Sub Repair(ByVal book As Workbook, ByVal links As Collection, ByVal cells As Collection)
    Dim link As Variant, cell As Variant, failed As Long, mode As XlCalculation
    mode = Application.Calculation
    Application.Calculation = xlCalculationManual
    For Each link In links
        If Not IsChanged(book, link) Then failed = failed + 1
    Next link
    For Each cell In cells
        If Not Entered(cell) Then failed = failed + 1
    Next cell
    Application.Calculation = mode
    If failed > 0 Then
        MsgBox CStr(failed) & " formulas or links could not be changed; the audit of the book shows which cells do not answer.", vbExclamation, "moletally"
    End If
End Sub

Private Function IsChanged(ByVal book As Workbook, ByVal link As String) As Boolean
    On Error GoTo Refused
    book.ChangeLink link, ThisWorkbook.FullName, xlLinkTypeExcelLinks
    IsChanged = True
Refused:
End Function

' Enters a formula again in our spelling: a dynamic array stays one, a fixed array keeps its range.
Private Function Entered(ByVal cell As Object) As Boolean
    Dim formula As String
    formula = MoleSpelling.OwnSpelling(MoleBook.FormulaOf(cell))
    On Error GoTo Refused
    If cell.NumberFormat = "@" Then cell.NumberFormat = "General" ' or the formula would become a text
    If MoleBook.IsFixedArray(cell) Then
        cell.CurrentArray.FormulaArray = formula
    Else
        EnterPlain cell, formula
    End If
    Entered = True
Refused:
End Function

Private Sub EnterPlain(ByVal cell As Object, ByVal formula As String)
    On Error GoTo OlderExcel
    cell.Formula2 = formula
    Exit Sub
OlderExcel:
    cell.Formula = formula
End Sub
