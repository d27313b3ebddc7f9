"""Formulas are rewritten for the engine without touching texts."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from uffuncs.headless.elementwise import lifted, may_lift
from uffuncs.headless.formula import Rewriter, called_names, own_name, tokens, without_external_references
from uffuncs.headless.intersection import intersected
from uffuncs.headless.structure import DefinedName, Table

NONE = "UF__OMITTED()"
PIECES = st.sampled_from(
    [
        '"a,,b"',
        '"UF_X(,)"',
        "'it''s'!",
        "[1]!",
        "_xll.",
        "UF_X(",
        "SUM(",
        "(",
        ")",
        ",",
        ",,",
        "{1,2}",
        "A1",
        "$B$2:C3",
        "#REF!",
        "#N/A",
        " ",
        "+",
        "Tab[x]",
        "Tab[[#This Row],[y]]",
        "rate",
        "1E+5",
        "\n",
        "[",
        "]",
        "'",
        '"',
        "\\",
        "é",
        "@",
        "#",
        "%",
        ":",
        "!",
        "1.5",
    ]
)


def rewriter(tables=(), names=()):
    return Rewriter({table.name.casefold(): table for table in tables}, list(names))


def rewritten(formula, **more):
    return rewriter(**more).rewrite(formula, "S", 3)


@given(st.lists(PIECES, max_size=12).map("".join) | st.text(max_size=30))
def test_tokens_join_up_to_the_formula(formula):
    assert "".join(text for _, text in tokens(formula)) == formula


TABLE = Table("Tab", "S", 1, 2, 5, 3, ["x", "y"])


@given(st.lists(PIECES, max_size=12).map("".join) | st.text(max_size=30))
def test_any_text_is_rewritten_without_failing(formula):
    rewriter([TABLE], [DefinedName("rate", None, "UF_X(S!$A$1)")]).rewrite(formula, "S", 3)
    intersected(formula)
    lifted(formula, {"rate"}, True)
    without_external_references(formula)


@given(st.text(max_size=40))
def test_texts_are_never_rewritten(text):
    literal = '"' + text.replace('"', '""') + '"'
    result = rewriter([TABLE], [DefinedName("rate", None, "UF_X(S!$A$1)")]).rewrite(
        f"_xll.UF_X({literal},,{literal})&{literal}", "S", 3
    )
    assert result == f"UF_X({literal},{NONE},{literal})&{literal}"


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("UF_X(1,,2)", f"UF_X(1,{NONE},2)"),
        ("UF_X(,1)", f"UF_X({NONE},1)"),
        ("UF_X(1,)", f"UF_X(1,{NONE})"),
        ("UF_X(,)", f"UF_X({NONE},{NONE})"),
        ("UF_X( , 1 )", f"UF_X( {NONE}, 1 )"),
        ("UF_X()", "UF_X()"),
        ("UF_X( )", "UF_X( )"),
        ("IF(A1,,2)", "IF(A1,,2)"),
        ("IF(,UF_X(1,,IF(1,,3)),)", f"IF(,UF_X(1,{NONE},IF(1,,3)),)"),
        ("UF_X((1),{1,2;3,4},,SUM(A1,,B1))", f"UF_X((1),{{1,2;3,4}},{NONE},SUM(A1,,B1))"),
        ("UF_X(UF_Y(,),)", f"UF_X(UF_Y({NONE},{NONE}),{NONE})"),
        ('UF_X(",,",,"a""b,,")', f'UF_X(",,",{NONE},"a""b,,")'),
        ("UF_X('a,,b'!A1,,1)", f"UF_X('a,,b'!A1,{NONE},1)"),
        ("_xlfn.SINGLE(A1:A3)+1", "@(A1:A3)+1"),
        ("_xlfn.CONCAT(A1,,B1)", "_xlfn.CONCAT(A1,,B1)"),
    ],
)
def test_omitted_arguments(formula, expected):
    assert rewritten(formula) == expected


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("Tab[x]", "$B$2:$B$5"),
        ("Tab", "$B$2:$C$5"),
        ("Tab[]", "$B$2:$C$5"),
        ("Tab[#All]", "$B$1:$C$5"),
        ("Tab[[#This Row],[x]]*2", "$B3*2"),
        ("Tab[@y]", "$C3"),
        ("Tab[@[y]]", "$C3"),
        ("Tab[@]", "$B3:$C3"),
        ("Tab[[#This Row],[x]:[y]]", "$B3:$C3"),
        ("Tab[[x]:[y]]", "$B$2:$C$5"),
        ("Tab[[#Headers],[y]]", "$C$1"),
        ("Tab[[#Headers],[#Data],[x]]", "$B$1:$B$5"),
        ("tab[X]", "$B$2:$B$5"),
        ("Tab[z]", "#REF!"),
        ("Tab[[#Totals],[x]]", "#REF!"),
        ("[@x]+1", "$B3+1"),
        ("Other[x]", "Other[x]"),
        ("Table[x]", "Table[x]"),
        ("[1]Tab!A1", "[1]Tab!A1"),
        ("Tab!A1", "Tab!A1"),
        ('SUM("Tab[x]",Tab[ x ])', 'SUM("Tab[x]",$B$2:$B$5)'),
    ],
)
def test_structured_references(formula, expected):
    assert rewritten(formula, tables=[TABLE]) == expected


def test_structured_references_from_elsewhere():
    table = Table("Q", "it's", 1, 1, 4, 2, ["a'b", "c]d"], totals_rows=1)
    rewrite = rewriter([table]).rewrite
    assert rewrite("Q[a''b]", "S", 9) == "'it''s'!$A$2:$A$3"
    assert rewrite("Q[[#Totals],[c']d]]", "S", 9) == "'it''s'!$B$4"
    assert rewrite("Q[@[a''b]]", "S", 2) == "#REF!"
    assert rewrite("Q[@[a''b]]", "it's", 4) == "#REF!"


def test_own_and_called_names():
    assert own_name("_xlfn._xll.uf_x") == "UF_X" and own_name("ORG.A.UF_X") == "UF_X"
    assert own_name("MY_UF_X") is None and own_name("UF_X.A") is None
    assert called_names('SUM(1,"FOO(",_xlfn.BAR(2))') == ["SUM", "_xlfn.BAR"]


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("[1]Sheet1!$A$1+1", "#REF!+1"),
        ("IFERROR('[2]a b'!A1:B2,7)", "IFERROR(#REF!,7)"),
        ("[1]!rate*2", "#REF!*2"),
        ('"[1]S!A1"&A1', '"[1]S!A1"&A1'),
        ("'C:\\x\\[b.xlsx]S'!A:A", "#REF!"),
        ("Tab[x]", "Tab[x]"),
    ],
)
def test_without_external_references(formula, expected):
    assert without_external_references(formula) == expected


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("A1:A4*2", "@A1:A4*2"),
        ("SUM(A1:A4)*B1:B4", "SUM(A1:A4)*@B1:B4"),
        ("ABS($A$1:$A$4)", "ABS(@$A$1:$A$4)"),
        ("IF(A:A>2,S!B:B,SUM(C:C))", "IF(@A:A>2,@S!B:B,SUM(C:C))"),
        ("'it''s'!A1:A2", "@'it''s'!A1:A2"),
        ("A1*2", "A1*2"),
        ("UF_X(A1:A4)", "UF_X(A1:A4)"),
        ("-(A1:A3+1)", "-(@A1:A3+1)"),
        ('"A1:A2"&A1:A2', '"A1:A2"&@A1:A2'),
        ("@A1:A2", "@A1:A2"),
        ("INDEX(ABS(A1:A3),2)", "INDEX(ABS(A1:A3),2)"),
        ("1:1", "@1:1"),
        ("areas+1", "@areas+1"),
        ("SUM(areas)", "SUM(areas)"),
    ],
)
def test_intersected(formula, expected):
    assert intersected(formula, {"areas"}) == expected


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("SUMPRODUCT(ABS(A1:A4))", "SUMPRODUCT(UF__EACH_ABS(A1:A4))"),
        ("SUM(LEN(TRIM(A1:A4)),LEN(A1))", "SUM(UF__EACH_LEN(UF__EACH_TRIM(A1:A4)),LEN(A1))"),
        ("ROUND(SUM(A1:A4),2)", "ROUND(SUM(A1:A4),2)"),
        ("SUM(ROUND((A1:A4)*2,1))", "SUM(UF__EACH_ROUND((A1:A4)*2,1))"),
        ("ROUND(UF_X(A1:A4),1)", "UF__EACH_ROUND(UF_X(A1:A4),1)"),
        ("ABS(@A1:A4)", "ABS(@A1:A4)"),
        ("SUM(ABS({1,2}))", "SUM(UF__EACH_ABS({1,2}))"),
        ("SUM(ABS(J1#))", "SUM(UF__EACH_ABS(J1#))"),
        ("SUM(ABS(areas))", "SUM(UF__EACH_ABS(areas))"),
        ('SUM(LEN("A1:A4"))', 'SUM(LEN("A1:A4"))'),
        ("SUM(ROW($A$3:B5))", "SUM(UF__ROWS(3,5))"),
        ("SUM(COLUMN(S!B:D))", "SUM(UF__COLUMNS(2,4))"),
        ("ROW(A1:A3)", "ROW(A1:A3)"),
        ("SUM(SIN(A1:A3))", "SUM(SIN(A1:A3))"),
        ("SUM(LOG10(TRANSPOSE(A1)))", "SUM(UF__EACH_LOG10(TRANSPOSE(A1)))"),
    ],
)
def test_lifted(formula, expected):
    assert lifted(formula, {"areas"})[0] == expected


@pytest.mark.parametrize(
    "formula, expected",
    [
        ("A1*2+SUM(A1:B1)", False),
        ("UF_X(A1:A4,1)", False),
        ("ROUND(UF_X(A1:A4,1),2)", True),
        ("SUM(ABS(A1:A4))", True),
        ("A1+B1", False),
        ("SUMPRODUCT(A1:A4,B1:B4)", True),
    ],
)
def test_may_lift(formula, expected):
    assert may_lift(formula) is expected
