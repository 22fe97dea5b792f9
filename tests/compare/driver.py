"""A merge driver as git calls it: python driver.py BASE OURS THEIRS NAME; exit 1 with something to settle."""

import sys
from pathlib import Path

from worksheet.compare.merge import merge_bytes

base, ours, theirs = map(Path, sys.argv[1:4])
done = merge_bytes(base.read_bytes(), ours.read_bytes(), theirs.read_bytes(), sys.argv[4])
ours.write_bytes(done.content)
sys.exit(0 if done.clean else 1)
