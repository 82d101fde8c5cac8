"""``python -m ductsolve``: the command without its script."""

import sys

from ductsolve.app.cli import main

sys.exit(main())
