"""The results file of a sweep: CSV that only grows, under a line that says what it holds.

A block of rows is one write at the end of the file, so that a run that is killed leaves whole rows
and at most one torn one, which has no newline and is dropped when the sweep goes on.
"""

from __future__ import annotations

import csv
import io
import json
import os
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any, Self

from ..errors import ResultsError

try:
    import fcntl
except ImportError:  # not on Windows; there two runs on one file are the user's own care
    fcntl = None  # type: ignore[assignment]

BEGINNING = "# bandwright sweep: "
_MODE = os.O_RDWR | os.O_CREAT | os.O_APPEND | getattr(os, "O_BINARY", 0)
#: what each key of the first line is about, in words
_ABOUT = {
    "bandwright": "of another version of bandwright",
    "design": "of another design",
    "over": "over other values",
    "columns": "with other metrics",
    "line": "about another line",
    "solved": "solved with other arguments",
}


class Record:
    """A results file that is open for one run.

    Parameters
    ----------
    path : path
    head : mapping
        What the file holds: JSON values by the keys that `_ABOUT` lists.
    columns : sequence of str
        Names of the columns, ``design`` first and ``reason`` last.
    size : int
        Number of designs.

    Raises
    ------
    ResultsError
        If the file can't be written, holds something else or results of something else.
    """

    def __init__(
        self, path: str | os.PathLike[str], head: Mapping[str, Any], columns: Sequence[str],
        size: int,
    ) -> None:  # fmt: skip
        self.path = Path(path)
        self._columns, self._size = tuple(columns), size
        self._head = dict(head)
        first = BEGINNING + json.dumps(self._head, ensure_ascii=False)
        self._start = f"{first}\n{','.join(_cell(name) for name in columns)}\n".encode()
        try:
            self._file = os.open(self.path, _MODE, 0o666)
        except OSError as error:
            raise self._error(f"can't be written: {error.strerror}") from None
        try:
            self._lock()
            self._begin()
        except BaseException:
            os.close(self._file)
            raise

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        os.close(self._file)

    def rows(self) -> Iterator[tuple[int, list[Any]]]:
        """Yield what is recorded, (number of the design from 0, its other cells).

        Raises
        ------
        ResultsError
            If a row can't be read.
        """
        seen = bytearray(self._size)
        with open(self.path, encoding="utf-8", newline="") as file:
            for _ in range(2):
                file.readline()
            for number, line in enumerate(file, start=3):
                design, cells = self._row(line, number)
                if seen[design]:
                    raise self._error(f"line {number}: design {design + 1} stands twice")
                seen[design] = 1
                yield design, cells

    def write(self, rows: Sequence[Sequence[Any]]) -> None:
        """Add rows, each the number of its design from 1 and the other cells."""
        if rows:
            self._write("".join(_line(row) for row in rows).encode())

    def _row(self, line: str, number: int) -> tuple[int, list[Any]]:
        try:
            (written,) = csv.reader([line.rstrip("\n")], strict=True)
            design, *cells = written
            if len(written) != len(self._columns) or not 1 <= int(design) <= self._size:
                raise ValueError
            return int(design) - 1, [_value(cell) for cell in cells]
        except (ValueError, csv.Error):
            raise self._error(
                f"line {number} is no row of this sweep; mend it, or give another file"
            ) from None

    def _lock(self) -> None:
        if fcntl is None:
            return
        try:
            fcntl.flock(self._file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            raise self._error("another run is writing it; wait for it, or give another file"
                              ) from None  # fmt: skip
        except OSError:  # some network file systems know no locks
            return

    def _begin(self) -> None:
        """Write the head of a new file, or check the one that stands there and drop a torn row."""
        length = os.fstat(self._file).st_size
        found = _read(self._file, 0, max(len(self._start), 1 << 16))
        torn = found.startswith(BEGINNING.encode()) and self._start.startswith(found)
        if not found or torn:  # new, or killed while its head was written
            os.ftruncate(self._file, 0)
            self._write(self._start)
            return
        if not found.startswith(self._start):
            self._refuse(found)
        os.ftruncate(self._file, _last_newline(self._file, length) + 1)

    def _refuse(self, found: bytes) -> None:
        text = found.decode("utf-8", "replace").partition("\n")[0]
        try:
            there = json.loads(text.removeprefix(BEGINNING))
            if not text.startswith(BEGINNING) or not isinstance(there, dict):
                raise ValueError
        except ValueError:
            raise self._error(
                "is no results file of a sweep, and stays as it is; give another file"
            ) from None
        other = [about for key, about in _ABOUT.items() if there.get(key) != self._head.get(key)]
        raise self._error(
            f"holds results {' and '.join(other) or 'in another layout'}, and stays as it is; give"
            " another file"
        )

    def _write(self, data: bytes) -> None:
        try:
            while data:
                data = data[os.write(self._file, data) :]
        except OSError as error:
            raise self._error(f"can't be written: {error.strerror}") from None

    def _error(self, message: str) -> ResultsError:
        return ResultsError(message, str(self.path))


def _read(file: int, start: int, length: int) -> bytes:
    os.lseek(file, start, os.SEEK_SET)
    return os.read(file, length)


def _last_newline(file: int, length: int) -> int:
    """Return the place of the last newline of a file."""
    step = 1 << 16
    stop = length
    while stop > 0:
        start = max(0, stop - step)
        found = _read(file, start, stop - start).rfind(b"\n")
        if found >= 0:
            return start + found
        stop = start
    return -1


def _line(cells: Sequence[Any]) -> str:
    return ",".join(_cell(cell) for cell in cells) + "\n"


def _cell(value: float | str | None) -> str:
    """Return a value as a cell from which `_value` reads it back exactly.

    Examples
    --------
    >>> [_cell(v) for v in (1, 0.1, float("nan"), None, "2 to 1", "a, b")]
    ['1', '0.1', '', '', '2 to 1', '"a, b"']
    """
    if value is None or value != value:  # nan is what a reader of CSV makes of nothing
        return ""
    if not isinstance(value, str):
        return str(value)
    if not value or value[0] == '"' or "\n" in value or "\r" in value or _value(value) != value:
        value = json.dumps(value, ensure_ascii=False)  # else it would come back as another kind
    if not any(mark in value for mark in ',"\n\r'):
        return value
    out = io.StringIO()
    csv.writer(out, lineterminator="").writerow([value])
    return out.getvalue()


def _value(cell: str) -> Any:
    """Return the value of a cell."""
    if not cell:
        return None
    if cell[0] == '"':
        return json.loads(cell)
    if cell in ("True", "False"):
        return cell == "True"
    try:
        return int(cell)
    except ValueError:
        pass
    try:
        return float(cell)
    except ValueError:
        return cell
