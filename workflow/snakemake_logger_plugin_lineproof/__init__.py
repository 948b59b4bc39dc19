"""What a run shows: steps done of steps to do, what is running, and a failure in our own words.

Snakemake finds logger plug-ins by the prefix of this package's name, and hands every event to `LogHandler`.
"""

from __future__ import annotations

import sys
from logging import ERROR, LogRecord

from snakemake_interface_logger_plugins.base import LogHandlerBase

from lineproof.progress import CURRENT


class LogHandler(LogHandlerBase):
    """Passes events on to the progress display of this process."""

    writes_to_stream = True
    writes_to_file = False
    has_filter = True
    has_formatter = True
    needs_rulegraph = False

    def emit(self, record: LogRecord) -> None:
        event = str(getattr(record, "event", None) or "")
        if event == "job_info":
            CURRENT.started(record.jobid, record.rule_name, dict(record.wildcards or {}))
        elif event == "job_finished":
            CURRENT.finished(record.job_id)
        elif event == "run_info":
            CURRENT.planned(record.stats)
        elif event == "progress":
            CURRENT.counted(record.done, record.total)
        elif event == "job_error":
            CURRENT.failed(record.rule_name, list(record.log or []))
        elif record.levelno >= ERROR:
            CURRENT.said(record.getMessage())

    def close(self) -> None:
        sys.stderr.flush()
        super().close()
