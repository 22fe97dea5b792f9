"""How records fare beside loops of commits: python -m tests.bench.revisions_beside_commits [SECONDS].

Prints what each side got through, what was refused, and what was corrupted or taken back (which should be none).
"""

import os
import sys
import tempfile
from pathlib import Path

from tests.history import loops


def main() -> None:
    """Run with one and with two loops of commits."""
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else 30.0
    for committers in (1, 2):
        with tempfile.TemporaryDirectory() as folder:
            (Path(folder) / ".gitconfig").write_text("[user]\nname = Ada\nemail = ada@example.org\n", "utf-8")
            os.environ |= {"HOME": folder, "GIT_CONFIG_NOSYSTEM": "1"}
            found = loops.run(Path(folder), seconds, committers)
        print(f"{committers} loop(s) of commits, {seconds:g} s, {found.revisions} revisions in all")
        print(f"  records: {dict(found.records)}")
        print(f"  commits: {dict(found.commits)}")
        print(f"  taken back: {len(found.fallen)}, left staged: {len(found.staged)}, fsck: {found.fsck or 'clean'}")
        for line in found.fallen:
            print(f"    {line}")


if __name__ == "__main__":
    main()
