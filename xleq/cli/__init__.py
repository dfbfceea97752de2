"""The command line: the only room that prints."""

from __future__ import annotations

import sys
import tempfile
import traceback
from pathlib import Path

from xleq.errors import XleqError

#: Exit codes: done; differences or findings; refused input or usage; done, but some cells kept their value.
DONE, DIFFERENT, REFUSED, KEPT = 0, 1, 2, 3


def main() -> None:
    """Run the command line and exit with its code."""
    from xleq.cli.commands import app

    try:
        app()
    except XleqError as e:
        print(f"xleq: {e}", file=sys.stderr)
        sys.exit(REFUSED)
    except KeyboardInterrupt:
        print("xleq: stopped; nothing that was begun has been written", file=sys.stderr)
        sys.exit(REFUSED)
    except BrokenPipeError:
        sys.stderr.close()  # the reader of our output has gone: nobody is left to tell
        sys.exit(DONE)
    except Exception:  # the outermost boundary: a defect of ours, told in one line, its traceback kept
        log = Path(tempfile.mkstemp(prefix="xleq-", suffix=".log")[1])
        log.write_text(traceback.format_exc(), encoding="utf-8")
        last = traceback.format_exc(limit=0).strip().splitlines()[-1]
        print(f"xleq: a defect in xleq itself ({last}); the traceback is in {log}", file=sys.stderr)
        sys.exit(REFUSED)
