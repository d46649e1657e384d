"""The same record as many scopes would write it."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from femag.bench import Capture, CaptureColumns, read_capture
from femag.errors import InputError

STEP = 2e-6
SIZE = 600
ANGLE = 2.0 * np.pi * np.arange(SIZE) / 100
CURRENT = 0.5 * np.sin(ANGLE)
VOLTAGE = 12.0 * np.cos(ANGLE)
TIME = STEP * np.arange(SIZE)

Written = tuple[str, CaptureColumns]


def table(columns: list[np.ndarray], separator: str = ",", decimal: str = ".") -> str:
    rows = (separator.join(f"{x:.9g}" for x in row) for row in np.column_stack(columns))
    return "\n".join(row.replace(".", decimal) for row in rows) + "\n"


def plain() -> Written:
    text = "Time (s),Current (A),Voltage (V)\n" + table([TIME, CURRENT, VOLTAGE])
    return text, CaptureColumns()


def decimal_commas() -> Written:
    text = "Zeit [ms];Strom [mA];Spannung [V]\r\n"
    return text + table([1e3 * TIME, 1e3 * CURRENT, VOLTAGE], ";", ","), CaptureColumns()


def tabs_and_unit_row() -> Written:
    text = "Scope text\nSerial no\t77\nx-axis\t1\t2\nsecond\tVolt\tVolt\n"
    return text + table([TIME, CURRENT / 10, VOLTAGE], "\t"), CaptureColumns(
        current="1", voltage="2", current_scale="10 A/V"
    )


def key_values_first() -> Written:
    text = "Record Length,600,\nSample Interval,2e-06,s\nVertical Scale,0.5,V\n\nTIME,CH1,CH2\n"
    return text + table([TIME, CURRENT / 10, VOLTAGE]), CaptureColumns(
        current="ch1", voltage="3", current_scale="100 mV/A"
    )


def key_values_beside() -> Written:
    body = table([TIME, CURRENT * 0.1, VOLTAGE]).splitlines()
    rows = [f"Record Length,{i},," + row for i, row in enumerate(body[:5])]
    rows += [",,," + row for row in body[5:]]
    return "\n".join(rows), CaptureColumns(current="2", voltage="3", shunt="100 mohm")


def no_time() -> Written:
    text = "i (mA); u_sense (mV)\n" + table([1e3 * CURRENT, 1e3 * VOLTAGE], ";")
    return text, CaptureColumns(sample_rate=1.0 / STEP)


def blanks_without_header() -> Written:
    return table([TIME, CURRENT, VOLTAGE / 10], "  "), CaptureColumns(
        current="2", current_scale="1", voltage_scale="10"
    )


def slashes_comments_and_trailing_separator() -> Written:
    text = "# made by hand\nt/us,i/A,u/kV,\n"
    body = table([1e6 * TIME, CURRENT, VOLTAGE / 1e3]).replace("\n", ",\n")
    return text + body, CaptureColumns()


def other_order_and_more_channels() -> Written:
    text = "CH4 [V],CH2 [V],time [us],probe [A]\n"
    return text + table([0 * TIME, VOLTAGE, 1e6 * TIME, CURRENT]), CaptureColumns(voltage="CH2")


@pytest.mark.parametrize(
    "written",
    [plain, decimal_commas, tabs_and_unit_row, key_values_first, key_values_beside, no_time,
     blanks_without_header, slashes_comments_and_trailing_separator, other_order_and_more_channels],
)  # fmt: skip
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
def test_every_form_gives_the_same_capture(
    tmp_path: Path, written: Callable[[], Written], encoding: str
) -> None:
    text, columns = written()
    file = tmp_path / "scope.csv"
    file.write_bytes(text.encode(encoding))
    capture = read_capture(file, columns)
    assert capture.step == pytest.approx(STEP, rel=1e-9)
    assert capture.current == pytest.approx(CURRENT, rel=1e-7, abs=1e-9)
    assert capture.voltage == pytest.approx(VOLTAGE, rel=1e-7, abs=1e-9)


def read(tmp_path: Path, text: str, **columns: str) -> Capture:
    file = tmp_path / "scope.csv"
    file.write_text(text)
    return read_capture(file, CaptureColumns(**columns))


def test_units_that_are_not_stated_are_said(tmp_path: Path) -> None:
    capture = read(tmp_path, "t,i,u\n" + table([TIME, CURRENT, VOLTAGE]), current_scale="1 A/V")
    assert [note.split(" states")[0] for note in capture.notes] == [
        "the current column", "the voltage column", "the time column",
    ]  # fmt: skip


def test_uneven_times_are_put_on_equal_steps_and_said(tmp_path: Path) -> None:
    """The current is a sine: its interpolated values have to be those of the sine."""
    time = TIME + 0.2 * STEP * np.sin(np.arange(SIZE) / 7.0)
    angle = 2.0 * np.pi * time / (100 * STEP)
    text = "t (s),i (A),u (V)\n" + table([time, np.sin(angle), np.cos(angle)])
    capture = read(tmp_path, text)
    exact = np.sin(2.0 * np.pi * (time[0] + capture.step * np.arange(SIZE)) / (100 * STEP))
    assert np.abs(capture.current - exact).max() < 1e-5
    assert any("time steps are not equal" in note for note in capture.notes)


def test_times_that_were_rounded_when_printed_count_as_equal(tmp_path: Path) -> None:
    rows = zip(TIME + 0.1, CURRENT, VOLTAGE, strict=True)
    text = "t (s),i (A),u (V)\n" + "".join(f"{t:.7f},{i:.6g},{u:.6g}\n" for t, i, u in rows)
    capture = read(tmp_path, text)
    assert not capture.notes
    assert capture.step == pytest.approx(STEP, rel=1e-3)


GOOD = table([TIME, CURRENT, VOLTAGE])
HEAD = "t (s),i (A),u (V)\n"
STUCK = table([np.round(TIME, 5), CURRENT, VOLTAGE])
GAP = table([TIME + 1e-4 * (np.arange(SIZE) > 99), CURRENT, VOLTAGE])
LATE = [*GOOD.splitlines()[:50], "1e-4,----,2", *GOOD.splitlines()[51:]]
NAN = GOOD.replace("\n0.0001,", "\n0.0001,nan,0\n0.0001,", 1)


@pytest.mark.parametrize(
    ("text", "columns", "problem", "accepted"),
    [
        (HEAD + GOOD, {"current": "foo"}, "--current-column = 'foo': no such column",
         "1 't', 2 'i', 3 'u'"),
        (HEAD + GOOD, {"current": "7"}, "no such column", "1 't', 2 'i', 3 'u'"),
        (HEAD + GOOD, {"current": "u", "voltage": "u"}, "one column is named twice", "of its own"),
        ("t (s),CH1 (V),CH2 (V)\n" + GOOD, {}, "not clear which column is the current", "2 'CH1'"),
        ("t (s),CH1 (V),CH2 (V)\n" + GOOD, {"current": "CH1"}, "the current column 'CH1' is in V",
         "'10 A/V'"),
        ("t (s),i,u\n" + GOOD, {}, "the current column 'i' states no unit", "--shunt"),
        (HEAD + GOOD, {"current_scale": "10 A/V"}, "the current column 'i' is in A", "in V"),
        (HEAD + GOOD, {"current_scale": "ten"}, "--current-scale = 'ten'", "10 A/V"),
        (HEAD + GOOD, {"current_scale": "3 A/s"}, "no scale", "10 A/V"),
        (HEAD + GOOD, {"voltage_scale": "0"}, "no number, or zero", "factor"),
        (HEAD + GOOD, {"shunt": "3 V"}, "no resistance", "0.1 ohm"),
        (HEAD + GOOD, {"shunt": "1 ohm", "current_scale": "1"}, "the same as", "one of the two"),
        ("t (V),i (A),u (V)\n" + GOOD, {"time": "t"}, "the time column 't' is in V", "in s"),
        (HEAD + STUCK, {}, "time does not increase at row", "--sample-rate"),
        (HEAD + GAP, {}, "the record has a gap of 51 steps at row 101", "without gaps"),
        (HEAD + "\n".join(LATE), {}, "1 of 600 values of the current are no numbers, the first in "
         "row 51", "without gaps"),
        (HEAD + NAN, {}, "values of the current are no numbers", "without gaps"),
        ("nothing\nhere\n", {}, "no table of numbers", "lines of two or more numbers"),
        ("", {}, "no table of numbers", "lines of two or more numbers"),
        (HEAD + table([TIME[:20], CURRENT[:20], VOLTAGE[:20]]), {}, "20 samples are too few", "40"),
    ],
)  # fmt: skip
def test_what_cannot_be_read_is_said_in_a_line(
    tmp_path: Path, text: str, columns: dict[str, str], problem: str, accepted: str
) -> None:
    with pytest.raises(InputError) as caught:
        read(tmp_path, text, **columns)
    line = str(caught.value)
    assert problem in line
    assert accepted in line.split("; accepted: ")[1]
    assert "scope.csv" in line
    assert "\n" not in line


def test_files_that_are_no_text_or_not_there(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"none\.csv: cannot be read \(No such file"):
        read_capture(tmp_path / "none.csv")
    (tmp_path / "x.csv").write_bytes(bytes(range(256)) * 4)
    with pytest.raises(InputError, match="no text file"):
        read_capture(tmp_path / "x.csv")


def test_a_sample_rate_and_a_time_column_are_one_too_many(tmp_path: Path) -> None:
    file = tmp_path / "scope.csv"
    file.write_text(HEAD + GOOD)
    with pytest.raises(InputError, match="the same as --sample-rate"):
        read_capture(file, CaptureColumns(time="t", sample_rate=5e5))
