Option Explicit
' Written by uffuncs @VERSION@; do not edit, "uffuncs install excel" writes it anew.
' A cell can reach the functions named UF_ and nothing else: every helper is Private.

Private mServer As Object

Private Function UfxAnswer(ByVal worksheetName As String, ByVal cells As Variant) As Variant
    Dim reply As Variant, attempts As Long, starting As Boolean
    On Error GoTo failed
again:
    starting = True
    If mServer Is Nothing Then Set mServer = ThisWorkbook.PythonServer(attempts > 0)
    starting = False
    reply = mServer.CallUDF(ThisWorkbook.Setting("module"), (worksheetName), cells)
    On Error GoTo 0
    UfxAnswer = UfxWithErrors(reply)
    Exit Function
failed:
    Set mServer = Nothing
    If starting Then
        UfxAnswer = "uffuncs: Python cannot be started. " & Left$(Err.Description, 200)
        Exit Function
    End If
    attempts = attempts + 1
    If attempts = 1 Then Resume again
    UfxAnswer = CVErr(xlErrValue)
End Function

' What an argument holds: the values of a range, Empty where nothing was given.
Private Function UfxCells(Optional ByVal argument As Variant) As Variant
    If IsMissing(argument) Then
        UfxCells = Empty
    ElseIf Not IsObject(argument) Then
        UfxCells = argument
    ElseIf Not TypeOf argument Is Range Then
        UfxCells = CVErr(xlErrValue)
    ElseIf argument.Areas.Count > 1 Then
        UfxCells = CVErr(xlErrValue)
    ElseIf argument.Rows.Count = argument.Worksheet.Rows.Count Then
        UfxCells = UfxUsedPart(argument)
    Else
        UfxCells = argument.Value2
    End If
End Function

' Whole columns, down to the last row in use.
Private Function UfxUsedPart(ByVal columns As Range) As Variant
    Dim lastRow As Long
    With columns.Worksheet.UsedRange
        lastRow = .Row + .Rows.Count - 1
    End With
    UfxUsedPart = columns.Resize(lastRow).Value2
End Function

' Error values come from Python as texts that start with the character 1.
Private Function UfxWithErrors(ByVal reply As Variant) As Variant
    Dim i As Long, j As Long
    If Not IsArray(reply) Then
        UfxWithErrors = UfxValue(reply)
        Exit Function
    End If
    If UfxDimensions(reply) = 1 Then
        For i = LBound(reply) To UBound(reply)
            reply(i) = UfxValue(reply(i))
        Next i
    Else
        For i = LBound(reply, 1) To UBound(reply, 1)
            For j = LBound(reply, 2) To UBound(reply, 2)
                reply(i, j) = UfxValue(reply(i, j))
            Next j
        Next i
    End If
    UfxWithErrors = reply
End Function

Private Function UfxValue(ByVal item As Variant) As Variant
    UfxValue = item
    If VarType(item) <> vbString Then Exit Function
    If Left$(item, 1) <> Chr$(1) Then Exit Function
    Select Case Mid$(item, 2)
@ERRORS@
        Case Else: UfxValue = CVErr(xlErrValue)
    End Select
End Function

Private Function UfxDimensions(ByVal reply As Variant) As Long
    Dim bound As Long
    On Error GoTo done
    bound = UBound(reply, 1)
    UfxDimensions = 1
    bound = UBound(reply, 2)
    UfxDimensions = 2
done:
End Function
