"""A headless Chromium of the system, for pages; skipped with a reason where there is none."""

import os
import shutil
from collections.abc import Iterator
from typing import Any

import pytest

#: Set to "required" where the browser must be there, so that nothing is skipped unseen.
REQUIRED = os.environ.get("BROWSER_TESTS") == "required"
_NAMES = ("chromium", "chromium-browser", "google-chrome")
_ARGUMENTS = (
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)


def _absent(reason: str) -> None:
    if REQUIRED:
        pytest.fail(f"BROWSER_TESTS=required, but {reason}")
    pytest.skip(reason)


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    """The browser; ``--no-sandbox`` because tests may run as root, on our own pages only."""
    try:
        from playwright.sync_api import sync_playwright
    except ImportError:
        _absent("the package playwright is not installed")
    found = next((path for name in _NAMES if (path := shutil.which(name))), None)
    if found is None:
        _absent(f"none of {', '.join(_NAMES)} is installed")
    with sync_playwright() as playwright:
        opened = playwright.chromium.launch(executable_path=found, args=list(_ARGUMENTS))
        yield opened
        opened.close()
