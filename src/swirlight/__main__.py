"""``python -m swirlight`` is the command ``swirlight``."""

from swirlight.cli.main import main

main()
