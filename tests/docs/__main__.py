"""``python -m tests.docs``: write the generated regions and the outputs of all pages anew."""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path

from tests.docs.generated import MAKERS
from tests.docs.pages import PAGES, Workshop, read, regions, runs, with_regions


def refreshed(text: str, folder: Path) -> str:
    """A page with everything in it made anew."""
    text = with_regions(text, {name: MAKERS[name]() for name in regions(text)})
    workshop = Workshop(folder)
    made = [(shown, workshop.run(fence.text)) for fence, shown in runs(text)]
    for shown, output in reversed(made):
        if shown is not None:
            text = text[: shown.start] + output + text[shown.start + len(shown.text) :]
    return text


def main() -> None:
    """Refresh every page, or those named."""
    for page in PAGES:
        if len(sys.argv) > 1 and page.name not in sys.argv[1:]:
            continue
        with tempfile.TemporaryDirectory() as folder:
            old = read(page)
            new = refreshed(old, Path(folder))
        if new != old:
            page.write_text(new, encoding="utf-8")
            print(f"refreshed: {page.name}")


if __name__ == "__main__":
    main()
