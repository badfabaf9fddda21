"""The store room: what a run leaves on disk, and reading it back.

`OutputSettings` and what belongs to it are here; the rest is taken from its own file, since it loads h5py:
`writer.RunWriter`, `checkpoints.Checkpoint`, `provenance.Provenance`, `reading.Run`.
"""

from .names import FIELDS
from .output import OutputSettings, ResolvedOutput, Window, build_window, resolve_output

__all__ = ["FIELDS", "OutputSettings", "ResolvedOutput", "Window", "build_window", "resolve_output"]
