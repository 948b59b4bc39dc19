"""What a job says when it fails: a known problem is one clear message, anything else keeps its traceback."""

from __future__ import annotations

import errno
import os
import shutil
import sys
import traceback
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from lineproof.locking import join_run
from lineproof.problems import KnownProblem

MESSAGE_ENDING = ".message"
_FULL = 1 << 16  # bytes; a disk with less left holds no message


@contextmanager
def job(snakemake: object) -> Iterator[None]:
    """Run the body of a rule's script.

    Everything the job prints, and the traceback of what goes wrong, is in the rule's log; what the user is to read is
    in a file beside it, from where the program shows it.
    """
    lock = join_run()
    log = Path(snakemake.log[0])
    message = log.with_suffix(MESSAGE_ENDING)
    try:
        message.unlink(missing_ok=True)
        _print_into(log)
        yield
    except KnownProblem as problem:
        _fail(message, str(problem), str(problem))
    except OSError as error:
        _fail(message, traceback.format_exc(), file_trouble(error))
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


def file_trouble(error: OSError) -> str:
    """What to read when a file could not be read or written: what is kept, and what to do."""
    file = error.filename or "a file"
    kept = "Nothing is half-written; what earlier steps wrote is whole and kept."
    if error.errno in (errno.ENOSPC, errno.EDQUOT):
        return (
            f"The disk is full.\n  {file} could not be written. {kept}\n"
            "    → make room, then give the same command again"
        )
    if error.errno == errno.EROFS:
        return (
            f"The disk can only be read.\n  {file} could not be written. {kept}\n"
            "    → make it writable, then give the same command again"
        )
    said = f"{error.strerror or error}: {error.filename or ''}".rstrip(": ")
    return f"A file could not be read or written.\n  {said}"


def without_message(log: str | os.PathLike) -> str:
    """What to say of a failed job that left no message: on a full disk not even that could be written."""
    folder = Path(log).parent
    if folder.exists() and shutil.disk_usage(folder).free < _FULL:
        return file_trouble(OSError(errno.ENOSPC, os.strerror(errno.ENOSPC)))
    return "It was ended from outside, or for want of memory; the same command goes on from there."


def _fail(message: Path, full: str, short: str) -> None:
    with suppress(OSError):  # the disk may be full
        message.write_text(short + "\n", encoding="utf-8")
    with suppress(OSError):
        print(full, file=sys.stderr, flush=True)
    sys.exit(1)
