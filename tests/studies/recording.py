"""Write what a study found, with the date, the commit and the versions it was found with."""

import json
import subprocess
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path

HERE = Path(__file__).parent


def write(name, rows, **settings):
    """Write rows (a list of plain dicts) to NAME.json beside the studies."""
    commit = subprocess.run(
        ["git", "describe", "--always", "--dirty", "--abbrev=12"],
        cwd=HERE,
        capture_output=True,
        text=True,
        check=True,
    )
    record = {
        "study": name,
        "date": datetime.now(UTC).date().isoformat(),
        "commit": commit.stdout.strip(),
        "versions": {p: version(p) for p in ("decayinfer", "numpy", "scipy", "pymc", "nutpie", "dynesty")},
        "settings": settings,
        "rows": rows,
    }
    path = HERE / f"{name}.json"
    path.write_text(json.dumps(record, indent=1) + "\n", encoding="utf-8")
    return path
