"""Memory of reading a log: so many bytes per row of its columns and a constant, and never the text itself.

The peak is at most PER_VALUE bytes per row and column of the record, beside CONSTANT for the blocks of text being read.
"""

from __future__ import annotations

import gzip
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import ident

PER_VALUE = 40  # bytes; the value itself is 8
CONSTANT = 100 * 2**20
COLUMNS = 4  # time, setpoint, command, speed

# A process of its own: the system's figure of the most memory it ever held counts what every library took.
READ = """
import sys
from pathlib import Path
import ident
def peak():
    return 1024 * int(Path("/proc/self/status").read_text().split("VmHWM:")[1].split()[0])
ident.read_csv(b"time,command,speed\\n" + b"".join(b"%d.5,%d.5,1.25\\n" % (k, k % 7) for k in range(100)))
before = peak()
print(ident.read_csv(Path(sys.argv[1])).rows, peak() - before)
"""


def written(path: Path, rows: int) -> Path:
    stamps = np.datetime_as_string(np.datetime64("2026-03-02T00:00:00.000") + 100 * np.arange(rows)).tolist()
    with path.open("w") as file:
        file.write("Time,SP,CO,PV\n")
        file.writelines(f"{stamp}Z,900.0,{k % 97 / 4},{k % 89 * 10.25}\n" for k, stamp in enumerate(stamps))
    return path


def peak(path: Path) -> int:
    done = subprocess.run([sys.executable, "-c", READ, str(path)], capture_output=True, text=True, check=True)
    return int(done.stdout.split()[1])


@pytest.mark.skipif(sys.platform != "linux", reason="the peak is read from /proc")
def test_memory_is_of_the_columns_and_not_of_the_text(tmp_path: Path) -> None:
    few, many = 250_000, 750_000
    peaks = [peak(written(tmp_path / f"{rows}.csv", rows)) for rows in (few, many)]
    per_row = (peaks[1] - peaks[0]) / (many - few)
    assert per_row < PER_VALUE * COLUMNS
    assert peaks[1] < PER_VALUE * COLUMNS * many + CONSTANT
    # The text held even once more would break the bound.
    assert (tmp_path / f"{many}.csv").stat().st_size / many > 35


def test_a_file_that_is_open_is_read_from_where_it_stands_and_left_open(tmp_path: Path) -> None:
    rows = b"time,command,speed\n" + b"".join(b"%d.5,%d.5,1.25\n" % (k, k % 7) for k in range(100))
    (tmp_path / "log").write_bytes(b"before" + rows)
    with (tmp_path / "log").open("rb") as file:
        file.seek(6)
        record = ident.read_csv(file)
        assert not file.closed
    assert record.source is not None
    assert record.source.sha256 == ident.read_csv(rows).source.sha256  # type: ignore[union-attr]
    with gzip.open(tmp_path / "packed", "wb") as packed:
        packed.write(rows)
    with gzip.open(tmp_path / "packed", "rb") as unpacked:
        assert np.array_equal(ident.read_csv(unpacked).speed, record.speed)  # type: ignore[arg-type]


def test_a_pipe_is_read_once() -> None:
    rows = b"".join(b"%d.5,%d.5,1.25\n" % (k, k % 7) for k in range(100))
    with subprocess.Popen(["printf", "time,command,speed\n" + rows.decode()], stdout=subprocess.PIPE) as sent:
        assert sent.stdout is not None
        assert ident.read_csv(sent.stdout).rows == 100  # type: ignore[arg-type]
