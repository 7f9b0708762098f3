"""Whatever is wrong with a sheet is named by row and column."""

from typing import Any

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from schemas.faults import Faulty, Malformed
from schemas.reading import read, read_system
from schemas.separation import SeparationQuestion
from schemas.sheet import read_sheet
from schemas.sheet.rows import MOST_CELLS

CSV = "text/csv"
Cells = dict[tuple[int | None, int | None], str]


def faults(text: str | bytes, content_type: str = CSV, question: Any = None) -> Cells:
    """The faults of a sheet by row and column."""
    data = text.encode() if isinstance(text, str) else text
    with pytest.raises(Faulty) as caught:
        checked(data, content_type, question)
    return {(fault.row, fault.column): fault.detail for fault in caught.value.faults}


def checked(data: bytes, content_type: str = CSV, question: Any = None) -> Any:
    sheet = read_sheet(data, content_type, question)
    return sheet.validated(lambda raw: read(question, raw) if question else read_system(raw))


def test_all_faults_are_reported_at_once_in_the_order_of_the_sheet() -> None:
    found = faults(
        "[system];x\nname;motions;gravity\nm;x|z;9,81\n\n"
        "[bodies]\nname;mass [lb];at.x;at.z;colour;mass\n"
        "a;1.234,5;1;;;\nb;40 kg;;3;red;\nc;abc;1,5;2;;;zz\n12;5;;;;\n"
        "[connections]\nkind;name;between;stiffness.z [N];stiffness.x;loss_factor [%]\n"
        "spring;s1;a|b;5;1 kN/mm;5\nsprig;s2;a|ground;5;1;\nspring;;a|nobody;-5;1;\n"
        "[bodies]\n[operation]\nname;min_rpm;max_rpm\nrun;100;-5\n[what]\n"
        "[options]\nrule.kind;damped;rule.mode_above\nfraction;yes;0,25\nagain\n",
        question=SeparationQuestion,
    )
    assert list(found) == [
        (None, None),  # there are no excitations at all
        (1, 2), (6, 5), (6, 6), (7, 2), (7, 3), (8, 2), (8, 3), (8, 4), (9, 2), (9, 3), (9, 7),
        (12, 4), (14, 1), (15, 2), (15, 3), (15, 4), (16, 1), (19, 3), (20, 1), (23, 2), (24, 1),
    ]  # fmt: skip
    assert found[7, 2].startswith("row 7, column B (mass): separators of thousands")


@pytest.mark.parametrize(
    ("text", "place", "says"),
    [
        ("name,mass\na,5\n", (1, 1), "begins with a block"),
        ("\n,remark\n[bodies]\nname\na\n", (2, 2), "begins with a block"),
        ("[bodies],,note\nname\na\n", (1, 3), "nothing may stand beside [bodies]"),
        ("[bodies]\nname\na,5\n", (3, 2), "no column of the header in row 2"),
        ("[bodies]\nname,,mass\na,,5\nb,7,\n", (2, 2), "has no title, but row 4"),
        ("[bodies]\nname,mas\na,5\n", (2, 2), "has no field 'mas'"),
        ("[bodies]\nname,at.w\na,5\n", (2, 2), "has no field 'at.w'"),
        ("[bodies]\nname,mass,mass [lb]\na,5,\n", (2, 3), "stands already in column 2"),
        ("[bodies]\nname,inertia.xx,inertia.xx\na,5,\n", (2, 3), "stands already in column 2"),
        ("[bodies]\nname,at.x,at.1,at.2,at.0\na,1,2,3,\n", (2, 5), "stands already in column 2"),
        ("[bodies]\nname,mass [N]\na,5\n", (2, 2), "'N' isn't a unit of mass"),
        ("[bodies]\nname,mass [zlorp]\na,5\n", (2, 2), "unknown unit 'zlorp'"),
        ("[bodies]\nname [kg]\na\n", (2, 1), "no unit belongs here"),
        ("[bodies]\nname,mass [lb]\na,5 lb\n", (3, 2), "stands in the header already"),
        ("[bodies]\nname,mass\na,five\n", (3, 2), "expected a number"),
        ("[bodies]\nname,mass\na,#REF!\n", (3, 2), "expected a number"),
        ("[bodies]\nname,mass\na,5 m\n", (3, 2), "'m' isn't a unit of mass"),
        ('[bodies]\nname,mass\na,"1,5"\n', (3, 2), "a decimal comma is read only where"),
        ("[bodies]\nname;mass\na;1.234,5\n", (3, 2), "separators of thousands"),
        ("[bodies]\nname;mass\na;1 234,5 kg\n", (3, 2), "separators of thousands"),
        ("[bodies]\nname,mass\na,1'234\n", (3, 2), "separators of thousands"),
        ("[bodies]\nname,mass\na,1e999\n", (3, 2), "must be a finite number"),
        ("[bodies]\nname,mass\na,TRUE\n", (3, 2), "expected a number"),
        ("[bodies]\nname,at.x,at.z\na,1,2\n", (3, 2), "item 1 of the list is missing"),
        ("[bodies]\nname,at.x,at.y,at.z\na,1,,2\n", (3, 3), "item 1 of the list is missing"),
        (
            "[bodies]\nname,inertia,motions,inertia.xx\na,1,rx,2\n",
            (3, 4),
            "another column gives this",
        ),
        ("[bodies]\nname,mass\n,5\n", (3, 1), "this field is needed"),
        ("[bodies]\nname,mass\na,5\na,6\n", (4, 1), "stands already"),
        ("[bodies]\nname\na\n[bodies]\nname\nb\n", (4, 1), "stands already in row 1"),
        ("[bodies]\nname\na\n[operation]\nname\n", (4, 1), "a system has no block [operation]"),
        ("[bodies]\nname\na\n[mass]\na/x\n1\n", (4, 1), "this kind has no such block"),
        ("[bodies]\nname\na\n[gravity]\n", (4, 1), "a column of [system]"),
        ("[system]\nname,bodies.0.name\nm,a\n[bodies]\nname\nb\n", (4, 1), "in [system] already"),
        ("[system]\nname\nm\nn\n[bodies]\nname\na\n", (4, 1), "has one row"),
        ("[system]\nname\n[bodies]\nname\na\n", (1, 1), "a row with the values is missing"),
        ("[bodies]\n", (1, 1), "expected at least 1 items"),
    ],
)
def test_a_fault_of_a_system_names_its_cell(text: str, place: Any, says: str) -> None:
    found = faults(text)
    assert says in found[place]
    assert len(found) == 1


@pytest.mark.parametrize(
    ("text", "place", "says"),
    [
        ("[mass]\na/x,c/x\n1,0\n0,1\n", (2, 2), "there is no degree of freedom 'c/x'"),
        ("[mass]\na/x\n1\n0\n", (2, 2), "the column of 'b/x' is missing"),
        ("[mass]\na/x,b/x\n1,0\n0\n", (4, 2), "an entry is missing"),
        ("[mass]\na/x,b/x\n1,0\n0,one\n", (4, 2), "expected a number"),
        ("[mass]\na/x,b/x\n1,0\n", (1, 1), "1 rows for 2 degrees of freedom"),
        ("[mass]\nrow,column,value\n0,0,1\n1,-1,1\n", (4, 2), "greater than or equal to 0"),
        ("[mass]\nrow,column,value\n0,0,1\n1,,1\n", (4, 2), "expected a whole number"),
        ("[mass]\nrow,column,value,symmetric\n0,0,1,yes\n", (3, 4), "expected true or false"),
        ("[mass]\nrow,column,values\n0,0,1\n", (2, 3), "no field 'values'"),
        ("[mass]\n", (1, 1), "the header and the rows are missing"),
        ("[mass]\nmatrix_market,more\n1,2\n", (2, 2), "there is no degree of freedom"),
    ],
)
def test_a_fault_of_a_matrix_names_its_cell(text: str, place: Any, says: str) -> None:
    system = (
        "[system]\nkind\nmatrices\n[degrees_of_freedom]\nname\na/x\nb/x\n"
        "[stiffness]\na/x,b/x\n1,0\n0,1\n"
    )
    row, column = place
    assert says in faults(system + text)[system.count("\n") + row, column]


@pytest.mark.parametrize(
    ("data", "place", "says"),
    [
        (b"", (None, None), "the body is empty"),
        ("[bodies]\nname;mass\na;5\nMotor é;6\n".encode("cp1252"), (4, 1), "byte 29 can't be read"),
        ("[bodies]\nmass,name\n5,é".encode("cp1252"), (3, 2), "in Windows-1252 it would be 'é'"),
        ("[bodies]\nname\n".encode("utf-16-le"), (1, 1), "UTF-16 without a byte order mark"),
        (b"\xff\xfe[\x00b", (1, 1), "byte 4 can't be read as UTF-16"),
        (b'[bodies]\nname,mass\n"a,5\nb,6\n', (3, 1), "a quote is opened and not closed"),
        (b'[bodies]\nname,mass\na,"5" kg\n', (3, 2), "text follows where it closes"),
        (b'[bodies]\nname,mass\n"a\nb",5\nc,"', (4, 2), "a quote is opened and not closed"),
        (b"[bodies]\nname\n" + b"x" * 200_000, (3, 1), "at most 131,072 characters"),
        (b"[bodies]\nname\n" + b"," * MOST_CELLS, (3, MOST_CELLS + 1), "cells"),
    ],
)
def test_what_is_no_sheet_is_malformed_at_its_cell(data: bytes, place: Any, says: str) -> None:
    with pytest.raises(Malformed) as caught:
        read_sheet(data, CSV)
    (fault,) = caught.value.faults
    assert (fault.row, fault.column) == place
    assert says in fault.detail


def test_every_row_with_broken_quotes_is_named() -> None:
    found = faults(b'[bodies]\nname,mass\n"a"b,5\nc,6\nd,"7"8\n')
    assert set(found) == {(3, 1), (5, 2)}


def test_an_unknown_charset_is_refused() -> None:
    assert "isn't known" in str(faults("[bodies]\n", "text/csv; charset=ebcdic"))


@pytest.mark.parametrize(
    ("block", "says"),
    [
        ("[what]\n", "there is no such block for this task"),
        ("[damped]\nvalue\nTRUE\n", "a column of [options]"),
        ("[rule]\nkind\ntorsional\n", "in [options] already"),
        ("[forces_at]\nexcitation;at\nother;a/x|a/x\n", "there is no such excitation"),
        ("[forces_at]\nexcitation;at\nu;a/x|b.x\n", "a degree of freedom is written"),
    ],
)
def test_a_fault_of_a_question_names_its_cell(block: str, says: str) -> None:
    text = (
        "[bodies]\nname;mass\na;5\n[operation]\nname;min_rpm;max_rpm\nr;1;2\n"
        "[excitations]\nname;order\nu;1\n[options]\nrule.kind\nfraction\n"
    )
    found = faults(text + block, question=SeparationQuestion)
    ((row, _),) = found
    assert row in (13, 15)
    assert says in str(found)


def test_the_system_of_a_question_does_not_stand_in_its_options() -> None:
    found = faults(
        "[options]\nsystem.kind,rule.kind\nbodies,torsional\n", question=SeparationQuestion
    )
    assert "blocks of its own" in found[1, 1]


def test_a_thousand_faults_are_enough() -> None:
    rows = "".join(f"b{number},1.200.300\n" for number in range(3000))
    with pytest.raises(Faulty) as caught:
        checked(("[bodies]\nname,mass\n" + rows).encode())
    assert len(caught.value.faults) <= 2001


BLOCK = st.sampled_from(
    ["[system]", "[bodies]", "[connections]", "[mass]", "[damping]", "[degrees_of_freedom]",
     "[operation]", "[excitations]", "[options]", "[forces_at]", "[rule]", "[what]", "[", "[]"]
)  # fmt: skip
TITLE = st.sampled_from(
    ["kind", "name", "note", "motions", "between", "at", "at.x", "at.2", "stiffness", "stiffness.z",
     "stiffness.0.1", "points.1.rpm", "sections.0.length [mm]", "section.kind", "mass [lb]", "row",
     "column", "value", "symmetric", "matrix_market", "a/x", "excitation", "order", "damped",
     "rule.kind", "min_rpm", "max_rpm [Hz]", "at.", ".", "x]", "[kg]"]
)  # fmt: skip
CELL = st.sampled_from(
    ["", "a", "b", "a|b", "|", "'", "'=1", "1", "-1,5", "1.5 kg", "1e999", "9" * 40, "TRUE", "x",
     "bodies", "matrices", "spring", "bearing", "beam", "tube", "steel", "z|rx", "a/x", '"', '"q"',
     "1 000"]
) | st.text(max_size=6)  # fmt: skip
ROW = (
    BLOCK.map(lambda cell: [cell])
    | st.lists(TITLE, min_size=1, max_size=6)
    | st.lists(CELL, max_size=7)
)


@given(
    rows=st.lists(ROW, max_size=14),
    separator=st.sampled_from([",", ";", "\t"]),
    question=st.sampled_from([None, SeparationQuestion]),
)
def test_no_sheet_raises_anything_but_faults(
    rows: list[list[str]], separator: str, question: Any
) -> None:
    data = "\n".join(separator.join(row) for row in rows).encode("utf-8", "surrogatepass")
    holds_only_faults(data, CSV, question)


@given(data=st.binary(max_size=80) | st.text(max_size=80).map(str.encode))
@example(b"[bodies]\n\x00,'")
@example(b"\xef\xbb\xbf")
@example(b"\xff\xfe")
def test_no_bytes_raise_anything_but_faults(data: bytes) -> None:
    holds_only_faults(data, CSV, None)
    holds_only_faults(data, "text/tab-separated-values; charset=utf-16", SeparationQuestion)


def holds_only_faults(data: bytes, content_type: str, question: Any) -> None:
    try:
        checked(data, content_type, question)
    except Faulty as fault:
        found = fault.faults
    else:
        return
    assert found
    for one in found:
        assert (one.row is None) == (one.column is None)
        assert one.row is None or (one.row > 0 and (one.column or 0) > 0)
