"""Run a foreign parser in a child process, so that no file can harm this one."""

from __future__ import annotations

import json
import mmap
import os
import re
import signal
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from geomprep.errors import FileError, InputError
from geomprep.files.contents import AnyArray

__all__ = ["Child", "Parsed", "ReadLimits"]


@dataclass(frozen=True)
class ReadLimits:
    """What reading one file may cost before it is given up.

    Attributes
    ----------
    memory_bytes : int
        Address space of the process that parses.
    seconds : float
        Time on the clock, and of the processor, for parsing.
    """

    memory_bytes: int = 8 << 30
    seconds: float = 300.0

    def __post_init__(self) -> None:
        """Refuse limits that nothing could keep."""
        if not (self.memory_bytes > 0 and 0 < self.seconds < 1e9):
            raise InputError(f"limits of {self.memory_bytes} bytes and {self.seconds} s: both must be above 0")


@dataclass(frozen=True)
class Parsed:
    """What the child hands back: its description and the arrays, in order.

    Attributes
    ----------
    answer : dict
        Class, counts per section of cells, names of arrays that hold no numbers.
    arrays : list of (str, str, array)
        Role, name and values.
    """

    answer: dict[str, Any]
    arrays: list[tuple[str, str, AnyArray]]

    def one(self, role: str) -> AnyArray | None:
        """The array with a role, or None."""
        return next((array for has, _, array in self.arrays if has == role), None)

    def named(self, role: str) -> list[tuple[str, AnyArray]]:
        """Name and values of all arrays with a role."""
        return [(name, array) for has, name, array in self.arrays if has == role]


class Child:
    """A process that has loaded a reader's library and waits for the order to read.

    Parameters
    ----------
    library : str
        One that the program knows, such as ``vtk xml`` or ``meshio``.
    name : str
        Name of the file as given, for messages.
    limits : ReadLimits
        Bounds of memory and time.
    program : str
        File beside this one that the process runs.
    """

    def __init__(self, library: str, name: str, limits: ReadLimits, program: str = "child.py") -> None:
        self._name, self._limits, self._library = name, limits, library
        self._output = _anonymous_file()
        place = str(Path(__file__).with_name(program))
        paths = json.dumps([path for path in sys.path if path])
        command = [sys.executable, "-I", place, paths, library, str(self._output)]
        environment = {**os.environ, "OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1"}
        self._process = subprocess.Popen(
            command,
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            pass_fds=(self._output,),
            env=environment,
        )

    def order(self, path: Path, reader: str) -> None:
        """Let the child read a file with one reader of its library."""
        order = {
            "path": os.fsencode(path).hex(),
            "reader": reader,
            "memory_bytes": self._limits.memory_bytes,
            "cpu_seconds": int(self._limits.seconds) + 1,
        }
        pipe, self._process.stdin = self._process.stdin, None
        try:
            if pipe is not None:
                with pipe:
                    pipe.write(json.dumps(order).encode() + b"\n")
        except BrokenPipeError:
            return  # the child has ended; `result` says how

    def result(self) -> Parsed:
        """Wait for the child and return what it read.

        Raises
        ------
        FileError
            The parser reported a fault, crashed, or ran out of time or memory.
        """
        try:
            text, _ = self._process.communicate(timeout=self._limits.seconds)
        except subprocess.TimeoutExpired:
            raise FileError(
                self._name, f"reading took longer than {self._limits.seconds:g} s; the file is damaged or too large"
            ) from None
        if self._process.returncode:
            raise FileError(self._name, _crash(self._process.returncode, self._limits))
        answer = json.loads(text)
        if answer["faults"]:
            raise FileError(self._name, f"{_one_line(answer['faults'])}; the file is damaged, write it anew")
        return Parsed(answer, self._arrays(answer["arrays"]))

    def _arrays(self, described: list[dict[str, Any]]) -> list[tuple[str, str, AnyArray]]:
        """Arrays of the output, mapped without a copy, in the machine's byte order."""
        size = os.fstat(self._output).st_size
        memory: Any = mmap.mmap(self._output, size, access=mmap.ACCESS_READ) if size else b""
        arrays = []
        for each in described:
            dtype, shape = np.dtype(each["dtype"]), tuple(each["shape"])
            flat = np.frombuffer(memory, dtype, int(np.prod(shape)), each["start"]) if 0 not in shape else None
            array = np.empty(shape, dtype) if flat is None else flat.reshape(shape)
            arrays.append((each["role"], each["name"], array.astype(dtype.newbyteorder("="), copy=False)))
        return arrays

    def close(self) -> None:
        """End the child, if it still runs, and free what it holds."""
        if self._output < 0:
            return
        self._process.kill()
        self._process.wait()
        for pipe in (self._process.stdin, self._process.stdout):
            if pipe is not None:
                pipe.close()
        os.close(self._output)
        self._output = -1


def _anonymous_file() -> int:
    """Descriptor of a file without a name: nothing is left behind however the program ends."""
    if hasattr(os, "memfd_create"):
        return os.memfd_create("geomprep", os.MFD_CLOEXEC)
    with tempfile.TemporaryFile() as stream:
        return os.dup(stream.fileno())


def _crash(code: int, limits: ReadLimits) -> str:
    """What the end of a child by a signal, or by an exit code, means."""
    if code == -signal.SIGXCPU:
        return f"reading took longer than {limits.seconds:g} s of processor time; the file is damaged or too large"
    if code in (-signal.SIGABRT, -signal.SIGKILL, 1):
        size = f"{limits.memory_bytes / 2**30:.3g} GiB"
        return (
            f"reading needs more memory than allowed ({size}), or the reader gave up; the file is damaged or too large"
        )
    how = signal.Signals(-code).name if code < 0 else f"exit code {code}"
    return f"the reader crashed on it ({how}); the file is damaged, write it anew"


def _one_line(faults: list[str]) -> str:
    """The first fault that says most, without line breaks, source lines or addresses."""
    text = " ".join(re.sub(r"^.*?\(0x[0-9a-f]+\): ", "", fault.strip(), flags=re.DOTALL) for fault in faults[:2])
    text = " ".join(re.sub(r"\(?0x[0-9a-f]+\)?:?", "", text).split())
    return (text if len(text) <= 200 else text[:197] + "...").rstrip(" .;")
