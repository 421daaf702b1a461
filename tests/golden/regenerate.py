"""Write the golden files anew: the margins document of every example flow.

Golden files freeze what the tool says about the examples, so that a change of any figure is seen and
meant; whether the figures are right is what the published checks and the stories in tests/flows test.
They are only ever written by running this script, from the repository's root:

    python tests/golden/regenerate.py

Look at the difference before you commit it, and say in the commit which figures moved and why.
"""

import json
from pathlib import Path
from typing import Any

import flowplan

FLOWS = Path(__file__).resolve().parents[2] / "flows"
GOLDEN = Path(__file__).resolve().parent


def text_of(document: dict[str, Any]) -> str:
    """Return a margins document as JSON with one margin a line, which makes differences readable."""
    head = json.dumps({k: v for k, v in document.items() if k != "margins"}, ensure_ascii=False)
    lines = (json.dumps(entry, ensure_ascii=False) for entry in document["margins"])
    return f'{head[:-1]}, "margins": [\n' + ",\n".join(lines) + "\n]}\n"


def main() -> None:
    for file in sorted(FLOWS.glob("*.yaml")):
        document = flowplan.analyse(flowplan.load(file)).to_document()
        (GOLDEN / f"{file.stem}.json").write_text(text_of(document), encoding="utf-8")


if __name__ == "__main__":
    main()
