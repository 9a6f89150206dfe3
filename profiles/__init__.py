"""
The science of vertical wind profiles: arrays in, arrays out, SI only.

Kernels take plain float arrays whose last axis is level and broadcast over the rest; analysers
take a :class:`~backveer.profiles.stack.Stack` and return a frozen dataclass of arrays. Nothing
here opens a file, draws or prints. Each module's first line says what it is about:

- What a profile is: labels, flags, stack, grid
- The earth and the air: earth, sun, daylight, air, humidity, hydrostatics, level_pressure
- What is wrong with a level, and how well the wind is known: quality, level_order, spikes,
  air_checks, wind_error
- How the wind turns: turning, direction
- Friction: ekman, ekman_members, ekman_search, ekman_moments, ekman_solver, ekman_errors,
  ekman_intervals, ekman_parameters, ekman_verdict, surface_layer, drag_law, neutral_layer,
  viscosity_profile, viscosity_search, viscosity_shapes, viscosity_verdict
- Distance from balance: geostrophic, balance, free_air, momentum_integral, stress_profile
- Temperature advection: thermal_wind, friction_correction, layer_line
- The boundary layer: boundary_layer, inversions, low_level_jet, steadiness
- All of it: statement
- The coming night: outlook
- Wind energy: rotor, rotor_levels, rotor_reasons, swept_area, hub_air, expected_veer,
  rotor_climate
- Aviation: low_level_shear, low_levels, sliding_layer, flight_path, shear_criteria, shear_cause,
  shear_statement, shear_series
- Lidar: velocity_azimuth
- Many profiles: climatology, classes, joint_table, block_bootstrap, events, interval_means
"""
