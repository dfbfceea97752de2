"""``python -m xleq.cli``, where the command is not on the path."""

from xleq.cli import main

main()
