"""Reading of current records: every way to write a table that is met, and every way to spoil one."""

import io

import numpy as np
import pytest

from strikeenergy.errors import InputError
from strikeenergy.lightning.record import Record, read_record
from strikeenergy.lightning.record_blocks import BlockReader
from strikeenergy.lightning.record_columns import choose_columns
from strikeenergy.lightning.record_layout import Layout, unit_in

ROWS = [(0.1 * k, round(np.sin(k / 3) * 7.25, 4)) for k in range(30)]
T = np.array([row[0] for row in ROWS]) * 1e-6
I = np.array([row[1] for row in ROWS]) * 1e3  # noqa: E741  (the current)


def table(heading, delimiter=",", decimal=".", end="\n", rows=ROWS, extra=""):
    lines = [delimiter.join(f"{x:.4f}".replace(".", decimal) for x in row) + extra for row in rows]
    return end.join([*heading, *lines, ""])


def read_text(text, **given):
    return read_record(io.StringIO(text), **given)


def problems(text, **given):
    with pytest.raises(InputError) as caught:
        read_record(io.StringIO(text) if isinstance(text, str) else io.BytesIO(text), **given)
    return [str(problem) for problem in caught.value.problems]


def good(record):
    np.testing.assert_allclose(record.t, T, rtol=1e-12, atol=1e-20)
    np.testing.assert_allclose(record.i, I, rtol=1e-12)
    return record


# -- tables that are read ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("heading", "delimiter", "decimal"),
    [
        (["Time [us],I (kA)"], ",", "."),
        (["Time (us), I [kA]"], ", ", "."),
        (["Time [us];I (kA)"], ";", "."),
        (["Zeit [µs];Strom [kA]"], ";", ","),
        (["t/µs\ti/kA"], "\t", ","),
        (["t in us\ti in kA"], "\t", "."),
        (["# t [us]  i [kA]"], "  ", "."),
        (["# t [us]  i [kA]"], " ", ","),
        (["# t/us i/kA"], "\t  ", "."),
        (["t_us,i_kA"], ",", "."),
        (["Time,Channel A", "(us),(kA)", ""], ",", "."),
        (["Time;CH1", "us;kA"], ";", ","),
        (["Recorder 7", "", "Samples,30", "Range,10 kA", "Time [usec],Current [kiloampere]"], ",", "."),
        (['"Time [us]","I (kA)"'], ",", "."),
        (["Trigger, level, 5, kA", "-----", "Time [us],I (kA)", "-----------"], ",", "."),
    ],
)
def test_headings_delimiters_and_decimal_signs(heading, delimiter, decimal):
    good(read_text(table(heading, delimiter, decimal)))


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1"])
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_encodings_and_line_ends(encoding, end):
    text = table(["Kanal für Blitzstrom", "Zeit [µs];Strom [kA]"], ";", ",", end)
    record = good(read_record(io.BytesIO(text.encode(encoding))))
    assert record.channels == ("Strom",)


def test_a_file_and_what_was_understood(tmp_path):
    path = tmp_path / "shot 12.csv"
    path.write_text(table(["Time [us];I (kA)"], ";", ","), encoding="utf-8")
    record = good(read_record(path))
    assert record.name == str(path)
    assert len(record) == 30
    assert "30 samples of I" in repr(record)
    assert record.understood == {
        "encoding": "utf-8",
        "heading": "1 lines",
        "delimiter": "semicolon",
        "decimal": "comma",
        "time": "column 1 'Time' in us (from the heading)",
        "current": "column 2 'I' in kA (from the heading)",
    }
    good(read_record(str(path)))


def test_no_heading_with_units_given():
    good(read_text(table([]), time_unit="us", current_unit="kA"))


def test_given_units_come_before_those_of_the_heading():
    record = read_text(table(["t [s],i [A]"]), time_unit="us", current_unit="kA")
    assert "(given)" in good(record).understood["time"]


def test_bytes_and_streams_without_a_name():
    assert read_record(io.BytesIO(table(["t [us],i [kA]"]).encode())).name == "<stream>"


def test_quoted_numbers_and_delimiters_at_the_end_of_lines():
    lines = [f'"{a:.4f}";"{b:.4f}";;'.replace(".", ",") for a, b in ROWS]
    good(read_text("\n".join(['"Time [us]";"I [kA]";;', *lines])))


def test_blank_lines_among_the_samples():
    good(read_text(table(["t [us],i [kA]"], end="\n\n")))


def test_whole_numbers_first_and_decimal_commas_later():
    rows = "".join(f"{k};0\n" for k in range(20_000)) + "20000;0,5\n20001;1,5\n"
    record = read_text("t [us];i [A]\n" + rows)
    assert record.i[-2:].tolist() == [0.5, 1.5]


def test_uneven_steps_are_kept():
    t = np.concatenate((np.arange(0, 10, 0.5), np.arange(10, 200, 10.0), np.geomspace(210, 5000, 20)))
    record = read_text("t [us],i [A]\n" + "".join(f"{x:.6f},1\n" for x in t))
    np.testing.assert_allclose(record.t, t * 1e-6, rtol=1e-6, atol=1e-12)


def test_rounded_times_are_no_gaps():
    read_text("t [us],i [A]\n" + "".join(f"{1.25 * k:.1f},1\n" for k in range(200)))
    read_text("t [us],i [A]\n" + "".join(f"{round(1.5 * k)},1\n" for k in range(200)))


def test_one_column_and_a_time_step():
    text = "I [kA]\n" + "".join(f"{b:.4f}\n" for _, b in ROWS)
    good(read_text(text, time_step="0.1 us"))
    good(read_text(text, time_step=1e-7))


def test_one_column_with_decimal_commas():
    text = "I [A]\n0,5\n1,5\n2,5\n"
    assert read_text(text, time_step="1 us").i.tolist() == [0.5, 1.5, 2.5]
    bare = "0,5\n1,5\n2,5\n"
    assert read_text(bare, time_step="1 us", current_unit="A", decimal=",").i.tolist() == [0.5, 1.5, 2.5]
    assert "may separate columns or be decimal signs" in problems(bare, time_step="1 us", current_unit="A")[0]
    assert read_text("t [us], i [A]\n0,5\n1,5\n2,5\n").i.tolist() == [5, 5, 5]


def test_a_time_step_stands_in_for_a_time_column():
    record = read_text("t [us],i [A]\n0.0,1\n0.0,2\n0.1,3\n", time_step="50 ns")
    np.testing.assert_allclose(record.t, [0, 50e-9, 100e-9])


def test_heading_lines_can_be_given():
    text = "12,13\n14,15\n" + table([])
    good(read_text(text, heading=2, time_unit="us", current_unit="kA"))


def test_headings_of_recorders():
    rows = "".join(f"{k * 1e-7:.3e},{k * 0.01:.3f}\n" for k in range(20))
    heads = (
        "Model,MSO44\nFirmware,1.2\n\nHorizontal Units,s\nSample Interval,1.0E-7\nRecord Length,20\n\nTIME,CH1\n",
        "RECORDER,12345,Waveform\nSegments,1,SegmentSize,500002\n#1,06-Feb-2026 10:00:00,0\nTime,Ampl\n",
        "Record Length,20\n",
    )
    for head in heads:
        record = read_text(head + rows, time_unit="s", scale="10 kA/V")
        assert len(record) == 20
        assert record.i[1] == pytest.approx(100)


def test_a_column_that_counts_samples():
    rows = "".join(f"{k},{k * 0.01:.2f},,\n" for k in range(20))
    text = "X,CH1,Start,Increment,\nSequence,Volt,-3.0e-05,1.0e-07\n" + rows
    assert "time_step, if the column counts samples" in problems(text, scale="1 kA/V")[0]
    record = read_text(text, time_step="0.1 us", scale="1 kA/V")
    assert record.channel == "Volt"
    assert (record.t[1], record.i[1]) == pytest.approx((1e-7, 10.0))
    rows = "".join(f"{k};{k / 10:.1f};{k}\n" for k in range(20))
    assert read_text("Sample;Time [us];I [kA]\n" + rows).channels == ("I",)


def test_both_ways_of_reading_agree(monkeypatch):
    """Whole blocks at once, and line by line: the same numbers or the same complaints, also from spoilt tables."""
    at_once = BlockReader._at_once
    rng = np.random.default_rng(0)
    for _ in range(150):
        sign = rng.choice([",", ";", "\t", " "])
        point = "," if sign != "," and rng.random() < 0.5 else "."
        lines = [
            f"{k * 0.5:.2f}{sign}{x:.3f}".replace(".", point) for k, x in enumerate(rng.normal(size=20) * 100)
        ]
        for _ in range(rng.integers(0, 3)):
            k, line = int(rng.integers(0, 20)), lines[int(rng.integers(0, 20))]
            ways = (
                line + sign + "1",
                line.split(sign)[0],
                line.replace("1", "x"),
                "",
                f" {line} ",
                line + sign,
            )
            lines[k] = ways[rng.integers(0, 6)]
        text = "\n".join([f"t[us]{sign}i[A]", *lines, ""])
        found = []
        for way in (at_once, lambda *_: None):
            monkeypatch.setattr(BlockReader, "_at_once", way)
            try:
                record = read_text(text)
                found.append((record.t.tolist(), record.i.tolist()))
            except InputError as error:
                found.append(str(error))
        assert found[0] == found[1]


# -- channels and scales ---------------------------------------------------------------------------------------

MANY = "t [us],shunt [V],coil [kA],Pearson 2 [kA]\n" + "".join(
    f"{k},{k}.5,{2 * k},{3 * k}\n" for k in range(10)
)


@pytest.mark.parametrize(
    ("channel", "factor"), [("coil", 2e3), ("COIL", 2e3), (2, 2e3), ("2", 2e3), ("Pearson 2", 3e3), (3, 3e3)]
)
def test_channel_by_name_or_number(channel, factor):
    record = read_text(MANY, channel=channel)
    np.testing.assert_allclose(record.i, np.arange(10) * factor)
    assert record.channels == ("shunt", "coil", "Pearson 2")


def test_channels_are_listed_where_they_cannot_be_told():
    listing = "1 = 'shunt', 2 = 'coil', 3 = 'Pearson 2'"
    assert listing in problems(MANY)[0]
    assert listing in problems(MANY, channel=4)[0]
    assert "no channel 'coyl'" in problems(MANY, channel="coyl")[0]
    assert "did you mean 'coil'" in problems(MANY, channel="coyl")[0]


def test_the_only_current_among_voltages_is_meant():
    text = "t [us],u [V],i [kA]\n" + "".join(f"{k},5,{k}\n" for k in range(10))
    assert read_text(text).channel == "i"


def test_a_time_column_for_each_channel():
    text = "t1 [us],i1 [A],t2 [ms],i2 [A]\n" + "".join(f"{k},1,{k},2\n" for k in range(10))
    assert read_text(text, channel="i1").t[-1] == pytest.approx(9e-6)
    assert read_text(text, channel="i2").t[-1] == pytest.approx(9e-3)


@pytest.mark.parametrize(
    ("heading", "given", "first"),
    [
        ("t [us],u [V]", {"scale": "10 kA/V"}, 10e3),
        ("t [us],u [mV]", {"scale": "10 kA/V"}, 10.0),
        ("t [us],u [V]", {"scale": "0.25 mohm"}, 4000.0),
        ("t [us],u [V]", {"scale": "-10 kA/V"}, -10e3),
        ("t [us],CH1", {"scale": "10 A/mV"}, 10.0),
        ("t [us],CH1", {"scale": 2000, "current_unit": "A"}, 2000.0),
        ("t [us],CH1", {"scale": "2000", "current_unit": "A"}, 2000.0),
        ("t [us],i [kA]", {"scale": -1}, -1000.0),
        ("Second,Volt", {"scale": "5 kA/V"}, 5000.0),
    ],
)
def test_scales(heading, given, first):
    record = read_text(f"{heading}\n" + "".join(f"{k},1\n" for k in range(5)), **given)
    np.testing.assert_allclose(record.i, first)


# -- units that are asked for -----------------------------------------------------------------------------------


def test_everything_that_is_missing_is_asked_for_at_once():
    found = problems("Time,CH1\n" + table([]))
    assert len(found) == 2
    assert "time_unit, such as 'us'" in found[0]
    assert "current_unit, such as 'kA'" in found[1]
    assert found[0].startswith("<stream>:1: ")


@pytest.mark.parametrize(
    ("heading", "given", "part"),
    [
        ("t [us],u [V]", {}, "such as '10 kA/V', or the resistance"),
        ("t [us],i [kA]", {"scale": "10 kA/V"}, "is for a voltage"),
        ("t [us],i [kA]", {"scale": 0}, "turns no number into a current"),
        ("t [us],i [kA]", {"scale": "10 kW"}, "turns no number into a current"),
        ("t [us],i [kA]", {"time_unit": "kA"}, "no unit of time"),
        ("t [us],i [kA]", {"current_unit": "kiloamps per thing"}, "no unit of current"),
        ("t [S],i [kA]", {}, "no unit of time"),
        ("t [us],i [div]", {}, "no unit of current"),
        ("t [us],A", {}, "has no unit"),
        ("t [us],i [kA]", {"time_step": "5"}, "time_step"),
        ("t [us],i [kA]", {"time_step": "-5 us"}, "no time step"),
        ("t [us],i [kA]", {"delimiter": "pipe"}, "'pipe' is no delimiter"),
        ("t [us],i [kA]", {"delimiter": "comma", "decimal": ","}, "at once"),
        ("t [us],i [kA]", {"decimal": "'"}, "no decimal sign"),
        ("t [us],i [kA]", {"gaps": "ignore"}, "gaps"),
    ],
)
def test_units_and_arguments_that_cannot_be(heading, given, part):
    found = problems(table([heading]), **given)
    assert any(part in problem for problem in found), found


def test_one_column_without_a_time_step():
    assert "give time_step" in problems("I [kA]\n1.5\n2.5\n3.5\n")[0]


@pytest.mark.parametrize(
    ("heading", "name", "unit"),
    [
        ("Time [us]", "Time", "us"),
        ("I (kA)", "I", "kA"),
        ("current/kA", "current", "kA"),
        ("t in ms", "t", "ms"),
        ("time, s", "time", "s"),
        ("t_us", "t", "us"),
        ("current_A", "current", "A"),
        ("Channel A", "Channel A", ""),
        ("CH_A", "CH_A", ""),
        ("Seconds", "Seconds", "s"),
        ("I (Amps)", "I", "A"),
        ("Pearson 2", "Pearson 2", ""),
    ],
)
def test_unit_in_a_heading(heading, name, unit):
    assert unit_in(heading) == (name, unit)


# -- spoilt files ------------------------------------------------------------------------------------------------


def spoilt(change, heading="Time [us],I (kA)"):
    """Return a table with one of its lines (from 1) changed."""
    lines = table([heading]).split("\n")
    for line, text in change.items():
        lines[line - 1] = text
    return "\n".join(lines)


@pytest.mark.parametrize(
    ("line", "text", "part"),
    [
        (12, "1.0,nan", "not a finite number"),
        (12, "1.0,inf", "not a finite number"),
        (12, "nan,5.0", "not a finite number"),
        (12, "1.0,", "the value is missing"),
        (12, "1.0,OVER", "'OVER' is not a number"),
        (12, "1.0,#####", "'#####' is not a number"),
        (12, "1.0,1_000", "'1_000' is not a number"),
        (12, "1.0,0x10", "'0x10' is not a number"),
        (12, "1.0,5 5", "'5 5' is not a number"),
        (12, "1.0,5.0,6.0", "3 columns instead of 2"),
        (12, "1.0", "1 columns instead of 2"),
        (12, "end of block", "is no line of samples"),
        (12, "0.9,5.0", "the time is the same"),
        (12, "0.2,5.0", "the time is before that"),
        (2, "0.0,abc", "'abc' is not a number"),
    ],
)
def test_a_bad_line_is_named(line, text, part):
    found = problems(spoilt({line: text}))
    assert any(problem.startswith(f"<stream>:{line}: ") and part in problem for problem in found), found


def test_a_decimal_comma_among_points():
    found = problems(spoilt({12: "1.0;5,5"}, "t [us];i [kA]").replace(",", ";").replace("5;5", "5,5"))
    assert "'5,5' is not a number with a decimal point" in found[0]


def test_all_problems_come_at_once_in_the_order_of_lines():
    found = problems(spoilt({5: "0.3,nan", 9: "0.7,x", 20: "0.1,5", 25: "2.3,5,5"}))
    assert [problem.split(":")[1] for problem in found] == ["5", "9", "20", "25"]


def test_a_missing_line_in_an_even_record():
    lines = table(["Time [us],I (kA)"]).split("\n")
    text = "\n".join(lines[:12] + lines[15:])
    assert problems(text) == [
        "<stream>:13: 3 samples are missing before this line; cut the record there, or give gaps = 'keep'"
    ]
    record = read_text(text, gaps="keep")
    assert len(record) == 27
    assert "line 13: 3 samples are missing" in record.remarks[0]


def test_where_a_block_ends_changes_nothing():
    """A gap, a repeated and a fallen time and a change of the step, with the end of a block at every line."""
    ticks = [*range(20), *range(23, 40), 39, *range(40, 55), 50, *range(55, 60), *range(60, 200, 5)]
    lines = [f"{tick},1\n".encode() for tick in ticks]
    layout = Layout("utf-8", ",", ".", 1, 2, 0, False, ("t", "i"), ("s", "A"))
    columns = choose_columns(layout, "file")
    found = set()
    for cut in range(len(lines)):
        reader = BlockReader(layout, columns, "file", 10)
        for part, line in ((lines[:cut], 1), (lines[cut : cut + 9], cut + 1), (lines[cut + 9 :], cut + 10)):
            if part:
                reader.take(b"".join(part), line)
        with pytest.raises(InputError) as caught:
            reader.finish()
        assert len(caught.value.problems) == len(set(caught.value.problems))
        found.add(tuple(problem.place for problem in caught.value.problems))
    assert found == {("file:21", "file:38", "file:54")}


def test_twenty_problems_are_shown_and_all_are_counted():
    found = problems("t [us],i [A]\n" + "0,1\n1,1\n2,1\n" + "".join(f"{k},nan\n" for k in range(3, 3003)))
    assert len(found) == 21
    assert "3000 problems in all, of which 20 are shown" in found[-1]
    found = problems("t [us],i [A]\n" + "0,1\n1,1\n2,1\n" + "".join(f"{k},what\n" for k in range(3, 303)))
    assert "300 problems in all" in found[-1]


def test_faults_far_into_a_file_have_the_right_line():
    rows = [f"{k},{k % 7}" for k in range(300_000)]
    rows[250_000] = "250000,bad"
    rows[299_000] = "298999,1"
    found = problems("t [us],i [A]\n" + "\n".join(rows) + "\n")
    assert [problem.split(":")[1] for problem in found] == ["250002", "299002"]


def test_cells_that_shift_between_lines_do_not_cancel():
    """One cell too many on a line and one too few on the next: the sum is right, the lines are not."""
    found = problems(spoilt({12: "1.0,5.0,1.1", 13: "5.0"}))
    assert [problem.split(":")[1] for problem in found[:2]] == ["12", "13"]
    blank = spoilt({12: "1.0 5.0 1.1", 13: "5.0"}, "# t [us]  i [kA]").replace(",", " ")
    assert len(problems(blank)) == 2


@pytest.mark.parametrize(
    ("data", "part"),
    [
        (b"", "the file is empty"),
        (b"\n\n", "no lines of numbers"),
        (b"hello\nworld\n", "no lines of numbers"),
        (b"\x00\x01\x02\x03" * 50, "no text table"),
        (b"\x01\x02\x03\x04" * 50, "control characters"),
        (b"PK\x03\x04" + b"\0" * 100, "a zip archive or a spreadsheet"),
        (b"\x1f\x8b\x08" + b"\0" * 100, "gzip"),
        (b"t [us],i [A]\n1,2\n", "fewer than two samples"),
        (b"1,2,3," * 800_000, "longer than"),
    ],
)
def test_files_that_are_no_records(data, part):
    found = problems(data, **({"time_unit": "us", "current_unit": "A"} if b"1,2,3" in data else {}))
    assert any(part in problem for problem in found), found


def test_places_that_are_no_files(tmp_path):
    for place, part in (
        (tmp_path, "this is a folder"),
        (tmp_path / "none.csv", "no such file"),
        ("a\0b", "cannot be read"),
    ):
        with pytest.raises(InputError, match=part):
            read_record(place)


def test_a_file_of_5_gb_is_refused_before_it_is_read(tmp_path, monkeypatch):
    """The file is sparse: 5 GB to the reader, a hundred kilobytes on the disk."""
    path = tmp_path / "long.csv"
    with path.open("wb") as file:
        file.write(b"t [us],i [kA]\n" + b"".join(b"%d.000,1.0000\n" % (10_000 + k) for k in range(6000)))
        file.truncate(5 * 10**9)
    monkeypatch.setattr(BlockReader, "take", lambda *_: pytest.fail("the samples were read"))
    with pytest.raises(
        InputError, match="in 5 GB are more than the 50 000 000 that are kept at once; nothing was read"
    ) as caught:
        read_record(path)
    assert "keep every" in str(caught.value)


def test_a_stream_above_the_limit_is_refused():
    with pytest.raises(InputError, match="more than the 20 that are kept"):
        read_text(table(["t [us],i [kA]"]), limit=20)
    good(read_text(table(["t [us],i [kA]"]), limit=30))


def test_no_file_stays_open(tmp_path):
    """An unclosed file is a ResourceWarning, which is an error here."""
    path = tmp_path / "bad.csv"
    path.write_text(spoilt({12: "1.0,nan"}))
    with pytest.raises(InputError, match=r"bad\.csv:12: "):
        read_record(path)
    path.unlink()


# -- arrays ----------------------------------------------------------------------------------------------------


def test_arrays_get_the_same_checks():
    assert len(Record.from_arrays([0, 1, 2], [0, 1, 0])) == 3
    with pytest.raises(InputError) as caught:
        Record.from_arrays([0, 1, 1, 3, 2], [0, np.nan, 1, 2, 3])
    assert [p.place for p in caught.value.problems] == [
        "record:sample 2",
        "record:sample 3",
        "record:sample 5",
    ]
    for t, i in (([0, 1], [0, 1, 2]), ([0], [1]), ([[0, 1]], [[0, 1]])):
        with pytest.raises(InputError, match="are no record"):
            Record.from_arrays(t, i)
