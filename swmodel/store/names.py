"""The names in the files: units, descriptions and, where CF has one that is true, standard names.

Standard names for the sea surface, sea water or air are not used: the layer may be any of them, or a turntable's.
"""

from __future__ import annotations

from dataclasses import dataclass

from ..grid.staggered import Location


@dataclass(frozen=True)
class FieldName:
    """What a file says of a field.

    Parameters
    ----------
    location : str
        Where on the C-grid it lies.
    units, long_name : str
        As CF and UDUNITS write them.
    standard_name : str
        From the CF standard name table; empty where none is true.
    """

    location: Location
    units: str
    long_name: str
    standard_name: str = ""


@dataclass(frozen=True)
class SeriesName:
    """What a file says of a time series.

    Parameters
    ----------
    units, long_name : str
        As CF and UDUNITS write them.
    """

    units: str
    long_name: str


DIMENSIONS: dict[Location, tuple[str, str]] = {
    "centre": ("y", "x"),
    "u": ("y", "x_face"),
    "v": ("y_face", "x"),
    "corner": ("y_face", "x_face"),
}

# SGRID 0.3: nodes are our corners, faces our cells, edge 1 crosses the first direction (x), edge 2 the second
SGRID_LOCATIONS: dict[Location, str] = {"centre": "face", "u": "edge1", "v": "edge2", "corner": "node"}

FIELDS: dict[str, FieldName] = {
    "eta": FieldName("centre", "m", "elevation of the surface or interface above its level at rest"),
    "h": FieldName("centre", "m", "thickness of the layer"),
    "u": FieldName("u", "m s-1", "velocity along x"),
    "v": FieldName("v", "m s-1", "velocity along y"),
    "speed": FieldName("centre", "m s-1", "speed, sqrt(2 K) with the kinetic energy K of the cell"),
    "divergence": FieldName("centre", "s-1", "divergence of the velocity"),
    "vorticity": FieldName("corner", "s-1", "relative vorticity"),
    "pv": FieldName("corner", "m-1 s-1", "potential vorticity (f + zeta)/h"),
}

STILL_FIELDS: dict[str, FieldName] = {
    "depth": FieldName("centre", "m", "thickness of the layer at rest"),
    "f": FieldName("corner", "s-1", "Coriolis parameter", "coriolis_parameter"),
}

SERIES: dict[str, SeriesName] = {
    "mass": SeriesName("m3", "volume of the fluid"),
    "energy_kinetic": SeriesName("m5 s-2", "kinetic energy per unit density"),
    "energy_potential": SeriesName("m5 s-2", "potential energy per unit density, counted from the rest surface"),
    "potential_enstrophy": SeriesName("m s-2", "potential enstrophy"),
    "circulation": SeriesName("m2 s-1", "circulation, the sum of relative vorticity times area"),
    "momentum_x": SeriesName("m4 s-1", "momentum along x per unit density"),
    "momentum_y": SeriesName("m4 s-1", "momentum along y per unit density"),
    "speed_max": SeriesName("m s-1", "largest speed"),
    "pv_min": SeriesName("m-1 s-1", "least potential vorticity"),
    "pv_max": SeriesName("m-1 s-1", "largest potential vorticity"),
    "rossby_number": SeriesName("1", "Rossby number"),
    "froude_number": SeriesName("1", "Froude number"),
    "divergence_rms": SeriesName("s-1", "root mean square of the divergence"),
    "vorticity_rms": SeriesName("s-1", "root mean square of the relative vorticity"),
}

# every term of a budget is in the units of its group
BUDGETS: dict[str, SeriesName] = {
    "mass_budget": SeriesName("m3 s-1", "rate of change of the volume"),
    "energy_budget": SeriesName("m5 s-3", "rate of change of the total energy per unit density"),
    "enstrophy_budget": SeriesName("m s-3", "rate of change of the potential enstrophy"),
    "circulation_budget": SeriesName("m2 s-2", "rate of change of the circulation"),
    "momentum_x_budget": SeriesName("m4 s-2", "rate of change of the momentum along x per unit density"),
    "momentum_y_budget": SeriesName("m4 s-2", "rate of change of the momentum along y per unit density"),
}
