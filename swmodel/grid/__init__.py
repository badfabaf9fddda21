"""The grid room: staggered coordinates, the basin, and the domain's halo."""

from .basin import Basin, LayerSettings, build_basin
from .staggered import EdgesSettings, Grid, GridSettings, build_grid

__all__ = ["Basin", "EdgesSettings", "Grid", "GridSettings", "LayerSettings", "build_basin", "build_grid"]
