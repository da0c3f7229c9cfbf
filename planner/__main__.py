"""``python -m planner`` is the ``limbcast`` command."""

from planner.cli import main

main()
