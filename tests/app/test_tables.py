"""Tables from CSV: columns in any order, usual units, and one sentence for every fault."""

from __future__ import annotations

import pickle
from pathlib import Path

import numpy as np
import pytest

from app import table_text
from app.analysis.results import Origin, Trust
from app.tables import (
    TableError,
    read_drag_table,
    read_lift_table,
    read_outline_table,
    table_source,
)
from solver.section import packed
from solver.section.polar import CellOrigin

SHIPPED = Path(__file__).parents[2] / "scenarios" / "measured"


@pytest.fixture
def write(tmp_path):
    def write(text, name="table.csv"):
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return write


PLAIN = "Re,alpha_deg,cl\n100000,0,0.1\n100000,1,0.2\n"


def test_the_shipped_runs_are_read_with_their_source():
    lift = read_lift_table(SHIPPED / "e387_model_e_lift.csv")
    drag = read_drag_table(SHIPPED / "e387_model_e_drag.csv")
    assert [(run.reynolds, run.rising) for run in lift] == [
        (100064, True),
        (100064, False),
        (200083, True),
        (200083, False),
        (300096, True),
        (460154, True),
        (499909, True),
    ]
    assert [run.reynolds for run in drag] == [100029, 199879, 300289, 349865, 459961, 500094]
    # First row of each table.
    assert np.degrees(lift[0].angle[0]) == pytest.approx(-10.21)
    assert (lift[0].lift[0], lift[0].moment[0]) == (-0.454, 0.0268)
    assert (drag[0].lift[0], drag[0].drag[0]) == (-0.292, 0.0472)
    for name in ("lift", "drag"):
        assert "NREL/SR-500-34515" in table_source(SHIPPED / f"e387_model_e_{name}.csv")


def test_the_shipped_outline_is_named_and_closed():
    name, coordinates = read_outline_table(SHIPPED / "e387_outline.csv")
    assert name == "E387"
    assert coordinates[0].tolist() == coordinates[-1].tolist() == [1.0, 0.0]


@pytest.mark.parametrize(
    "text",
    [
        "cl,Re,alpha_deg\n0.1,100000,0\n0.2,100000,1\n",
        "CL;Reynolds number;Alpha (deg)\n0,1;100000;0\n0,2;100000;1\n",
        "Re/1000\tAoA [rad]\tCl\n100\t0\t0.1\n100\t0.017453292519943295\t0.2\n",
        "alpha  Re(1e6)  cl\n0 0.1 1e-1\n1 0.1 2e-1\n",
        "# a comment\n\nRe_k,alpha,cl,other\n100,0,.1,x\n\n100,1,.2,y\n",
        "\ufeffRe,alpha,cl\r\n0.1,0,0.1\r\n0.1,1,0.2\r\n",
        '"Re","alpha","cl"\n"100000","0","0.1"\n"100000","1","0.2"\n',
    ],
)
def test_columns_in_any_order_and_usual_units_say_the_same(write, text):
    (run,) = read_lift_table(write(text))
    assert run.reynolds == pytest.approx(1e5)
    assert np.degrees(run.angle) == pytest.approx([0.0, 1.0])
    assert run.lift == pytest.approx([0.1, 0.2])
    assert run.rising


def test_the_caller_says_which_column_is_which(write):
    path = write("n,w,auftrieb,richtung\n0.2,0,0.1,up\n0.2,0.1,0.2,up\n")
    (run,) = read_lift_table(
        path,
        columns={"reynolds": "n", "angle": "w", "lift": "auftrieb", "sweep": "richtung"},
        units={"angle": "rad", "reynolds": "1e6"},
    )
    assert run.reynolds == pytest.approx(2e5)
    assert run.angle.tolist() == [0.0, 0.1]


def test_rising_and_falling_sweeps_are_kept_apart(write):
    rows = "100000,0,0.1,up\n100000,1,0.2,up\n100000,1,0.15,down\n100000,0,0.1,down\n"
    up, down = read_lift_table(write("Re,alpha,cl,sweep\n" + rows))
    assert (up.rising, down.rising) == (True, False)
    assert down.lift.tolist() == [0.15, 0.1]


def test_a_lone_reading_joins_the_run_beside_it(write):
    path = write("Re,alpha,cl,cd\n300000,0,.1,.01\n300000,1,.2,.01\n302000,2,.3,.01\n")
    (run,) = read_drag_table(path)
    assert run.lift.tolist() == [0.1, 0.2, 0.3]
    assert run.reynolds == 300000


@pytest.mark.parametrize(
    ("text", "parts"),
    [
        ("", ["is empty"]),
        ("  \n\n", ["is empty"]),
        ("# only a comment\n", ["has no rows"]),
        ("Re,alpha,cl\n", ["headings only", "line 1"]),
        ("Re,alpha\n1e5,0\n1e5,1\n", ["no column for lift", "cl", "Re, alpha", "line 1"]),
        (PLAIN.replace("0.2", "much"), ["line 3", "'cl'", "'much'", "finite number"]),
        (PLAIN.replace("0.2", "nan"), ["line 3", "'cl'", "'nan'", "finite number"]),
        (PLAIN.replace("0.2", "inf"), ["line 3", "'inf'"]),
        (PLAIN.replace("0.2", "1_0"), ["line 3", "'1_0'"]),
        (PLAIN.replace("0.2", ""), ["line 3", "'cl'", "''"]),
        (PLAIN.replace("0.2", "1e999"), ["line 3", "finite"]),
        (PLAIN.replace("0.2", "7"), ["line 3", "'cl'", "between -5 and 5", "'7'"]),
        (PLAIN.replace(",1,", ",500,"), ["line 3", "'alpha_deg'", "-180", "180", "'500'"]),
        (PLAIN.replace("100000", "-100000"), ["line 2", "'Re'", "between"]),
        (PLAIN + "100000,2\n", ["line 4", "2 fields", "3"]),
        (PLAIN + '100000,"2,0.3\n', ["line 4", "not a row"]),
        (PLAIN + "200000,0,0.1\n", ["line 4", "only reading", "200000"]),
        (PLAIN.replace("alpha_deg", "alpha (grad)"), ["'grad'", "deg, rad"]),
        ("Re,alpha,cl,Cl\n1e5,0,1,1\n1e5,1,1,1\n", ["two columns for lift"]),
        ("Re,alpha,cl,sweep\n1e5,0,1,up\n1e5,1,1,left\n", ["line 3", "'sweep'", "'left'", "up"]),
        (PLAIN.encode() + b"\xff\n", ["line 4", "0xff", "UTF-8"]),
        (PLAIN.encode() + b"1,\x00\n", ["line 4", "zero byte"]),
    ],
)
def test_every_fault_is_one_sentence_that_names_the_place(write, text, parts):
    path = write(text)
    with pytest.raises(TableError) as caught:
        read_lift_table(path)
    message = str(caught.value)
    assert message.startswith(str(path))
    assert "\n" not in message
    for part in parts:
        assert part in message


@pytest.mark.parametrize("drag", ["0", "-0.01", "9"])
def test_drag_that_cannot_be_is_refused(write, drag):
    path = write(f"Re,alpha,cl,cd\n1e5,0,0.1,0.01\n1e5,1,0.2,{drag}\n")
    with pytest.raises(TableError, match=r"line 3, column 'cd': must be above 0 and at most 5"):
        read_drag_table(path)


def test_a_lift_table_is_no_drag_table(write):
    with pytest.raises(TableError, match="no column for drag"):
        read_drag_table(write(PLAIN))


def test_a_column_that_is_not_there_is_named(write):
    with pytest.raises(TableError, match="no column 'lift coefficient'"):
        read_lift_table(write(PLAIN), columns={"lift": "lift coefficient"})
    with pytest.raises(TableError, match="no quantity 'colour'"):
        read_lift_table(write(PLAIN), columns={"colour": "cl"})


def test_sizes_are_checked_before_reading(tmp_path, monkeypatch):
    path = tmp_path / "big.csv"
    with path.open("wb") as stream:
        stream.truncate(300_000_000)
    monkeypatch.setattr(Path, "open", lambda *_: pytest.fail("read a file that is too large"))
    with pytest.raises(TableError, match="has 300 MB; a table may have at most 8 MB"):
        read_lift_table(path)


def test_too_many_rows_are_refused(write, monkeypatch):
    monkeypatch.setattr(table_text, "MOST_ROWS", 1)
    with pytest.raises(TableError, match="has 2 rows; a table may have 1"):
        read_lift_table(write(PLAIN))


def test_a_missing_file_and_a_folder_are_refused(tmp_path):
    with pytest.raises(TableError, match="does not exist"):
        read_lift_table(tmp_path / "none.csv")
    with pytest.raises(TableError, match="not a regular file"):
        read_outline_table(tmp_path)


def test_the_error_survives_a_process_boundary(write):
    with pytest.raises(TableError) as caught:
        read_lift_table(write(PLAIN.replace("0.2", "much")))
    copy = pickle.loads(pickle.dumps(caught.value))
    assert str(copy) == str(caught.value)
    assert (copy.line, copy.column, copy.value) == (3, "cl", "much")


@pytest.mark.parametrize(
    "text", ["x,y\n1,0\n0,0\n1,0\n", "1,0\n0,0\n1,0\n", "y;x\n0;1\n0;0\n0;1\n", "1 0\n0 0\n1 0\n"]
)
def test_outlines_with_and_without_headings(write, text):
    name, coordinates = read_outline_table(write(text, "my section.csv"))
    assert name == "my section"
    assert coordinates.tolist() == [[1.0, 0.0], [0.0, 0.0], [1.0, 0.0]]


@pytest.mark.parametrize(
    ("text", "part"),
    [
        ("x,z\n1,0\n0,0\n1,0\n", "no columns x and y"),
        ("x,y\n1,0\n0,a\n1,0\n", "line 3, column 'y'"),
        ("x,y\n1,0\n1,0\n", "three or more"),
        ("1,0,0\n0,0,0\n1,0,0\n", "no columns x and y"),
    ],
)
def test_what_is_no_outline_is_refused(write, text, part):
    with pytest.raises(TableError) as caught:
        read_outline_table(write(text))
    assert part in str(caught.value)


def test_computed_points_that_are_missing_are_passed_over(write):
    text = "reynolds,angle_deg,cl,status\n" + "".join(
        f"100000,{angle},{lift},{status}\n"
        for angle, lift, status in (
            (0, 0.1, "converged"),
            (1, "", "missing"),
            (2, 0.3, "beyond stall"),
        )
    )
    (run,) = read_lift_table(write(text))
    assert run.lift.tolist() == [0.1, 0.3]
    with pytest.raises(TableError, match="no rows but those whose status is missing"):
        read_lift_table(write("reynolds,angle_deg,cl,status\n100000,1,,missing\n"))
    with pytest.raises(TableError, match="line 3, column 'cl': must be a finite number"):
        read_lift_table(write(text.replace("missing", "converged")))


def test_codes_of_solver_and_results_are_the_same():
    assert {o.name: o.value for o in CellOrigin} == {o.name: o.value for o in Origin}
    assert (packed.VALID, packed.EXTRAPOLATED, packed.INDICATIVE) == (
        Trust.VALID,
        Trust.EXTRAPOLATED,
        Trust.INDICATIVE,
    )
