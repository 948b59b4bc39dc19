"""The paper: tables, figures and report, printed from the estimates without any statistics."""
