"""``python -m fluxface.addon FILE.blend``: what ``fluxface render`` starts, under the bpy module."""

from __future__ import annotations

import sys

from .. import addon
from .unattended import main

if __name__ == "__main__":
    addon.register()
    code = main(sys.argv[1:])
    addon.unregister()
    sys.exit(code)
