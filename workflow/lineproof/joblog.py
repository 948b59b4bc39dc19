"""What a job says when it fails: a known problem is one clear message, anything else keeps its traceback."""

from __future__ import annotations

import os
import sys
import traceback
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from lineproof.locking import join_run
from lineproof.problems import KnownProblem

MESSAGE_ENDING = ".message"


@contextmanager
def job(snakemake: object) -> Iterator[None]:
    """Run the body of a rule's script.

    Everything the job prints, and the traceback of what goes wrong, is in the rule's log; what the user is to read is
    in a file beside it, from where the program shows it.
    """
    lock = join_run()
    log = Path(snakemake.log[0])
    message = log.with_suffix(MESSAGE_ENDING)
    message.unlink(missing_ok=True)
    _print_into(log)
    try:
        yield
    except KnownProblem as problem:
        _fail(message, str(problem), str(problem))
    except OSError as error:
        said = f"{error.strerror or error}: {error.filename or ''}".rstrip(": ")
        _fail(message, traceback.format_exc(), f"A file could not be read or written.\n  {said}")
    except Exception:
        full = traceback.format_exc()
        summary = full.strip().rsplit("\n", 1)[-1]
        _fail(message, full, f"This is a fault of the program, not of your data.\n  {summary}")
    else:
        print("done")
        sys.stdout.flush()
    finally:
        if lock is not None:
            lock.close()


def _print_into(log: Path) -> None:
    """Send standard output and errors of this process, warnings of compiled code included, to the log."""
    handle = os.open(log, os.O_WRONLY | os.O_CREAT | os.O_TRUNC)
    for stream in (sys.stdout, sys.stderr):
        stream.flush()
        os.dup2(handle, stream.fileno())
    os.close(handle)


def _fail(message: Path, full: str, short: str) -> None:
    message.write_text(short + "\n", encoding="utf-8")
    print(full, file=sys.stderr, flush=True)
    sys.exit(1)
