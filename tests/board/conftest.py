"""Pictures of the screens are kept as what they are: SVG."""

from __future__ import annotations

from pytest_textual_snapshot import SVGImageExtension

# The plugin sets the name that an older syrupy asked for.
SVGImageExtension.file_extension = "svg"
