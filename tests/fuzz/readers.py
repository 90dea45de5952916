"""A fuzzing run over all readers, led by the code that each file reaches.

Needs the extra ``fuzz``::

    python tests/fuzz/readers.py SECONDS [--finds FOLDER] [--seed N]

Every file is held against the rules of ``oracle``: in memory and in blocks, ``look`` and
``measure``, warnings as errors, bounded in time and memory. Each find is kept once, under the
place in the code where it broke, beside its traceback; the run goes on. It ends with 1 if there
were any. Keep a find as a small file in ``tests/malformed`` with its expectation, and mend it.
"""

from __future__ import annotations

import argparse
import os
import resource
import shutil
import signal
import sys
import tempfile
import time
import traceback
import warnings
from pathlib import Path
from types import FrameType

import atheris

with atheris.instrument_imports(include=["benchtool"]):
    import oracle

    import benchtool.diagnose.findings
    import benchtool.formats.arrays
    import benchtool.formats.text.reader
    import benchtool.formats.vcd.reader
    import benchtool.formats.wav.reader
    import benchtool.observation
    import benchtool.timing.node  # noqa: F401 - imported here so that they are instrumented

import mutations
import seeds

MOST_BYTES = 6000
CPU_S = 4.0
"""Time of the processor for all readings of one file."""
MEMORY_BYTES = 1 << 30
"""Above what the process holds when the run begins."""


class HangError(Exception):
    """A file took too long."""


def _hang(_signal: int, _frame: FrameType | None) -> None:
    raise HangError(f"more than {CPU_S} s of processor time")


class Run:
    """Tries one file after the other and keeps what broke."""

    def __init__(self, finds: Path, seconds: float) -> None:
        self.finds = finds
        self.seconds = seconds
        self.began_s = time.monotonic()
        self.n_tried = 0
        self.outcomes: dict[str, int] = {}
        self.seen: dict[str, int] = {}
        self.scratch = Path(tempfile.mkdtemp(prefix="benchtool-fuzz-"))
        tempfile.tempdir = str(self.scratch)

    def try_one(self, data: bytes) -> None:
        """Hold one file against the rules."""
        self.n_tried += 1
        path = self.scratch / "capture"
        path.write_bytes(data)
        signal.setitimer(signal.ITIMER_PROF, CPU_S)
        try:
            outcome = oracle.attempt(path)
        except Exception as error:
            outcome = self._keep(data, error)
        finally:
            signal.setitimer(signal.ITIMER_PROF, 0)
        self.outcomes[outcome] = self.outcomes.get(outcome, 0) + 1
        for spooled in self.scratch.glob("benchtool-*"):
            spooled.unlink()
        if time.monotonic() - self.began_s > self.seconds:
            self.end()

    def _keep(self, data: bytes, error: Exception) -> str:
        """Keep the smallest file of each kind of break."""
        place = _place(error)
        if len(data) < self.seen.get(place, 1 << 30):
            self.seen[place] = len(data)
            (self.finds / place).write_bytes(data)
            told = "".join(traceback.format_exception(error))
            (self.finds / f"{place}.traceback").write_text(told, errors="replace")
        return f"BROKEN {place}"

    def end(self) -> None:
        """Say what was done, and leave."""
        minutes = (time.monotonic() - self.began_s) / 60
        print(f"\n{self.n_tried} files in {minutes:.1f} minutes; {len(self.seen)} kinds of break")
        for outcome, count in sorted(self.outcomes.items(), key=lambda item: -item[1]):
            print(f"{count:9d}  {outcome}")
        sys.stdout.flush()
        shutil.rmtree(self.scratch, ignore_errors=True)
        os._exit(1 if self.seen else 0)  # the fuzzer has no other way out that keeps the code


def _place(error: Exception) -> str:
    """Name the kind of break by its class and the last line of benchtool it passed."""
    frames = traceback.extract_tb(error.__traceback__)
    ours = [f for f in frames if "benchtool" in Path(f.filename).parts] or list(frames)
    last = ours[-1]
    where = f"{Path(last.filename).stem}.{last.name}"
    words = str(error).split(",")[0] if isinstance(error, AssertionError) else ""
    name = f"{type(error).__name__}-{where}-{words}"
    return "".join(c if c.isalnum() or c in "-._" else "_" for c in name)[:80]


def main() -> None:
    """Run the fuzzer for the time given."""
    parser = argparse.ArgumentParser(description="Fuzz all readers.")
    parser.add_argument("seconds", type=float)
    parser.add_argument("--finds", type=Path, default=Path("fuzz-finds"))
    parser.add_argument("--seed", type=int, default=1)
    wanted = parser.parse_args()
    wanted.finds.mkdir(parents=True, exist_ok=True)
    run = Run(wanted.finds.resolve(), wanted.seconds)
    corpus = run.scratch / "corpus"
    corpus.mkdir()
    print(f"{seeds.write_seeds(corpus)} seeds; finds go to {run.finds}")
    warnings.simplefilter("error")
    signal.signal(signal.SIGPROF, _hang)
    _limit_memory()

    def changed(data: bytes, most: int, seed: int) -> bytes:
        return mutations.mutate(data, most, seed, atheris.Mutate)

    flags = [f"-max_len={MOST_BYTES}", f"-seed={wanted.seed}", "-timeout=600", "-rss_limit_mb=0"]
    atheris.Setup(
        [sys.argv[0], *flags, "-verbosity=0", str(corpus)], run.try_one, custom_mutator=changed
    )
    atheris.Fuzz()


def _limit_memory() -> None:
    held = int(Path("/proc/self/statm").read_text().split()[0]) * resource.getpagesize()
    resource.setrlimit(resource.RLIMIT_AS, (held + MEMORY_BYTES, resource.RLIM_INFINITY))


if __name__ == "__main__":
    main()
