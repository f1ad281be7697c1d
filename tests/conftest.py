"""What every test stands on: one environment on every machine, and no skipped test in continuous integration."""

from __future__ import annotations

import os

import numpy as np  # loaded before any test can choose its vectors: numpy warns of names it does not know
import pytest
from hypothesis import settings

# Help texts, tables and pictures come out alike whatever terminal the suite is started from.
os.environ.update(COLUMNS="120", NO_COLOR="1", TERM="dumb", MPLBACKEND="agg")
os.environ.pop("FORCE_COLOR", None)

assert np.__version__
IN_CI = os.environ.get("CI") == "true"

# No deadline: a loaded machine is no bug. In continuous integration the examples are the same in every run.
settings.register_profile("colloc", deadline=None, derandomize=IN_CI)
settings.load_profile("colloc")


def _not_run(session: pytest.Session) -> list[str]:
    reporter = session.config.pluginmanager.get_plugin("terminalreporter")
    if reporter is None:
        return []
    return [report.nodeid for outcome in ("skipped", "xfailed") for report in reporter.stats.get(outcome, [])]


@pytest.hookimpl(tryfirst=True)
def pytest_sessionfinish(session: pytest.Session) -> None:
    """Under ``CI=true`` a test that did not run, or was allowed to fail, fails the run."""
    if IN_CI and session.exitstatus == pytest.ExitCode.OK and _not_run(session):
        session.exitstatus = pytest.ExitCode.TESTS_FAILED


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    if IN_CI:
        for outcome in ("skipped", "xfailed"):
            for report in terminalreporter.stats.get(outcome, []):
                terminalreporter.write_line(f"not allowed here ({outcome}): {report.nodeid}", red=True)
