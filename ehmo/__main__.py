"""``python -m ehmo``: the same as the command ``ehmo``."""

from __future__ import annotations

import sys

from ehmo.cli import main

sys.exit(main())
