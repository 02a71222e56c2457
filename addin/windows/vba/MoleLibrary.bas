Attribute VB_Name = "MoleLibrary"
' The one module that touches xlwings' DLL: it starts the Python process, hands a call over, lets go.
'
' Made on the model of the VBA module that comes with xlwings (open-source part, BSD 3-clause, notice below),
' with these differences: one process for all workbooks; no setting is read from a workbook; Python is started
' directly, so that its end is seen at once instead of after two minutes behind a waiting command window; the
' command is checked for length; nothing is looked up again at each call; a process that ended is replaced.
'
' Copyright (C) 2014-present, Zoomer Analytics LLC. All rights reserved.
'
' Redistribution and use in source and binary forms, with or without modification,
' are permitted provided that the following conditions are met:
'
' * Redistributions of source code must retain the above copyright notice, this
'   list of conditions and the following disclaimer.
'
' * Redistributions in binary form must reproduce the above copyright notice, this
'   list of conditions and the following disclaimer in the documentation and/or
'   other materials provided with the distribution.
'
' * Neither the name of the copyright holder nor the names of its
'   contributors may be used to endorse or promote products derived from
'   this software without specific prior written permission.
'
' THIS SOFTWARE IS PROVIDED BY THE COPYRIGHT HOLDERS AND CONTRIBUTORS "AS IS" AND
' ANY EXPRESS OR IMPLIED WARRANTIES, INCLUDING, BUT NOT LIMITED TO, THE IMPLIED
' WARRANTIES OF MERCHANTABILITY AND FITNESS FOR A PARTICULAR PURPOSE ARE
' DISCLAIMED. IN NO EVENT SHALL THE COPYRIGHT HOLDER OR CONTRIBUTORS BE LIABLE FOR
' ANY DIRECT, INDIRECT, INCIDENTAL, SPECIAL, EXEMPLARY, OR CONSEQUENTIAL DAMAGES
' (INCLUDING, BUT NOT LIMITED TO, PROCUREMENT OF SUBSTITUTE GOODS OR SERVICES;
' LOSS OF USE, DATA, OR PROFITS; OR BUSINESS INTERRUPTION) HOWEVER CAUSED AND ON
' ANY THEORY OF LIABILITY, WHETHER IN CONTRACT, STRICT LIABILITY, OR TORT
' (INCLUDING NEGLIGENCE OR OTHERWISE) ARISING IN ANY WAY OUT OF THE USE OF THIS
' SOFTWARE, EVEN IF ADVISED OF THE POSSIBILITY OF SUCH DAMAGE.
Option Explicit
Option Private Module

#If Win64 Then
    Private Declare PtrSafe Function XLPyDLLActivateAuto Lib "xlwings64-{xlwings}.dll" (ByRef result As Variant, Optional ByVal config As String = "", Optional ByVal mode As Long = 1) As Long
#Else
    Private Declare PtrSafe Function XLPyDLLActivateAuto Lib "xlwings32-{xlwings}.dll" (ByRef result As Variant, Optional ByVal config As String = "", Optional ByVal mode As Long = 1) As Long
#End If
#If VBA7 Then
    Private Declare PtrSafe Function LoadLibrary Lib "kernel32" Alias "LoadLibraryA" (ByVal path As String) As LongPtr
#End If

Private Const WORKSHEET_MODULE As String = "moletally.hosts.windows.worksheet"

Private server As Object

' The key under which excel.conf names the DLL for this Excel.
Public Function LibraryKey() As String
    #If Win64 Then
        LibraryKey = "dll64"
    #Else
        LibraryKey = "dll32"
    #End If
End Function

Public Function IsConnected() As Boolean
    IsConnected = Not server Is Nothing
End Function

' Starts the process and waits until it answers; False with the words of the DLL if it ended or can't be had.
Public Function Started(ByVal library As String, ByVal startCommand As String, ByRef problem As String) As Boolean
    Dim answer As Variant
    If LoadLibrary(library) = 0 Then
        problem = "Windows can't load " & library
        Exit Function
    End If
    If XLPyDLLActivateAuto(answer, startCommand, 1) <> 0 Then
        problem = CStr(answer)
        Exit Function
    End If
    Set server = answer
    Started = True
End Function

' Calls a function of the worksheet module; False with the number and words of the error if that raised one.
Public Function Asked(ByVal name As String, ByVal arguments As Variant, ByRef result As Variant, ByRef number As Long, ByRef words As String) As Boolean
    On Error GoTo Failed
    result = server.CallUDF(WORKSHEET_MODULE, name, arguments)
    Asked = True
    Exit Function
Failed:
    number = Err.Number
    words = Err.Description
End Function

' The process ends by itself when the last object of it is let go.
Public Sub LetGo()
    Set server = Nothing
End Sub
