"""
The science of vertical wind profiles: arrays in, arrays out, SI only.

Kernels take plain float arrays whose last axis is level and broadcast over the rest; analysers
take a :class:`~backveer.profiles.stack.Stack` and return a frozen dataclass of arrays. Nothing
here opens a file, draws or prints.

Modules
-------
labels           what a variable is called, its unit and its meaning; hand-over to xarray, pandas
flags            the findings that a level can carry
stack            what a stack of profiles is
grid             common heights, sums and integrals over levels
earth            Coriolis parameter, gravity, geopotential
air              moist air, hydrostatics, the standard atmosphere
quality          what is wrong with a level
wind_error       the standard error of a wind component
turning          direction that unwraps
ekman            the Ekman family, fitted
thermal_wind     thermal wind and temperature advection
geostrophic      evidence for the geostrophic wind, departure, momentum integral
boundary_layer   depths, inversions, jets, Richardson number
statement        runs the analysers over a stack
"""
