/* Draws the statement's JSON: words, panels over a common height, hodograph and tables.
   One place formats a number, one place draws a picture; the report and the desk both load this file.
   Everything that comes from a file is set as text, never as markup. */
"use strict";
const backveer = (() => {
  // ---- numbers: SI inside, converted at the last moment --------------------------------------
  const KNOT = 1852 / 3600, FOOT = 0.3048; // exact: ISO 80000-3:2019, annex B
  const UNITS = {
    si: {
      speed: ["m/s", 1], height: ["m", 1], rate: ["deg/100 m", 1], shear: ["m/s/30 m", 1 / 30],
      pressure: ["hPa", 100], advection: ["K/h", 1 / 3600], gradient: ["K/100 km", 1e-5],
      angle: ["deg", 1], viscosity: ["m²/s", 1], ratio: ["", 1],
    },
  };
  UNITS.aviation = {
    ...UNITS.si, speed: ["kt", KNOT], height: ["ft", FOOT],
    rate: ["deg/1000 ft", 100 / (1000 * FOOT)], shear: ["kt/100 ft", KNOT / (100 * FOOT)],
  };
  const known = (x) => x !== null && x !== undefined && Number.isFinite(x);
  const decimals = (error) => {
    if (!(error > 0)) return 1;
    const exponent = Math.floor(Math.log10(error));
    return Math.min(Math.max(0, -exponent + (error / 10 ** exponent < 2 ? 1 : 0)), 6);
  };
  const fixed = (x, places, sign) => {
    const shown = (Math.abs(x) < 0.5 * 10 ** -places ? 0 : x).toFixed(places).replace("-", "−");
    return sign && x >= 0 ? "+" + shown : shown;
  };
  // A value in people's unit with a fixed number of decimals; a dash where there is none.
  const plain = (x, unit, places = 0, sign = false) =>
    known(x) ? fixed(x / unit[1], places, sign) : "–";
  // A value and its error, rounded by the error.
  const pm = (x, error, unit, sign = false) => {
    if (!known(x)) return "not determined";
    if (!(error > 0)) return fixed(x / unit[1], 1, sign); // no error is stated
    const places = decimals(error / unit[1]);
    return `${fixed(x / unit[1], places, sign)} ± ${fixed(error / unit[1], places)}`;
  };
  const withUnit = (text, unit) => (unit[0] ? `${text} ${unit[0]}` : text);

  // ---- the profile as the pictures need it ---------------------------------------------------
  const direction = (u, v) => ((Math.atan2(-u, -v) * 180) / Math.PI + 360) % 360;
  function prepare(profile) {
    const L = profile.levels, fit = profile.ekman, points = [];
    let before = null, first = null;
    L.height.forEach((z, i) => {
      const u = L.eastward_wind[i], v = L.northward_wind[i];
      const p = { z, u, v, flags: L.level_flag[i], there: known(z) && known(u) && known(v) };
      if (!p.there) { points.push(p); return; }
      p.speed = Math.hypot(u, v);
      p.direction = p.speed > 0 ? direction(u, v) : null;
      // The continuous direction goes the shorter way from level to level, past unusable ones.
      if (p.direction !== null && !p.flags) {
        p.followed = before === null ? p.direction
          : before + ((((p.direction - before) % 360) + 540) % 360) - 180;
        before = p.followed;
        if (first === null) first = p.followed;
        p.turned = p.followed - first;
      }
      points.push(p);
    });
    const departure = profile.geostrophic ? profile.geostrophic.departure : { height: [] };
    departure.height.forEach((z, i) => {
      const p = points.find((q) => q.z === z);
      if (p) { p.along = departure.along[i]; p.across = departure.across[i]; }
    });
    return { profile, points, used: points.filter((p) => p.there && !p.flags), model: model(fit, profile.coriolis) };
  }
  // The fitted spiral and its geostrophic wind at a height; null where it is not determined.
  function model(fit, coriolis) {
    if (!fit || fit.verdict === "not determined" || !known(fit.scale_height)) return null;
    const s = coriolis.coriolis_parameter < 0 ? -1 : 1;
    const a = fit.departure_eastward_at_ground, b = fit.departure_northward_at_ground;
    const balance = (z) => [
      fit.geostrophic_eastward_wind + (fit.geostrophic_eastward_shear || 0) * z,
      fit.geostrophic_northward_wind + (fit.geostrophic_northward_shear || 0) * z,
    ];
    const wind = (z) => {
      const [u, v] = balance(z), e = Math.exp(-z / fit.scale_height);
      const c = e * Math.cos(z / fit.scale_height), d = -s * e * Math.sin(z / fit.scale_height);
      return [u + a * c - b * d, v + b * c + a * d];
    };
    return { wind, balance, top: fit.top, scale: fit.scale_height };
  }

  // ---- small pieces of page ------------------------------------------------------------------
  const make = (parent, tag, attributes = {}, text) => {
    const node = document.createElement(tag);
    for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value);
    if (text !== undefined) node.textContent = text;
    parent.append(node);
    return node;
  };
  const empty = (node) => { node.replaceChildren(); return node; };
  function table(parent, caption, head, rows) {
    const box = make(parent, "div", { class: "wide", tabindex: "0", role: "region", "aria-label": caption });
    const t = make(box, "table");
    make(t, "caption", {}, caption);
    const top = make(make(t, "thead"), "tr");
    for (const [name, unit, word] of head) {
      const th = make(top, "th", { scope: "col", ...(word ? { class: "word" } : {}) }, name);
      if (unit) make(th, "span", { class: "unit" }, unit);
    }
    const body = make(t, "tbody");
    for (const row of rows) {
      const tr = make(body, "tr");
      row.forEach((cell, i) => make(tr, "td", head[i][2] ? { class: "word" } : {}, cell));
    }
    return t;
  }
  const section = (parent, title, id) => {
    const s = make(parent, "section", { "aria-labelledby": id });
    make(s, "h2", { id }, title);
    return s;
  };

  // ---- words ---------------------------------------------------------------------------------
  // Without slip the angle is 45 degrees whatever the air does: it is no measurement.
  const imposed = (fit) => (fit.model === "no slip" ? ", the angle that no slip imposes" : "");
  const angle = (fit, U) => (imposed(fit) ? plain(fit.cross_isobar_angle, U.angle) : pm(fit.cross_isobar_angle, fit.errors.cross_isobar_angle, U.angle));
  function sentences(data, U) {
    const { profile, used } = data, said = [];
    const t = profile.turning, fit = profile.ekman;
    const span = (a, b) => `${plain(a, U.height)} to ${plain(b, U.height)} ${U.height[0]}`;
    if (used.length > 1) {
      const low = used[0], high = used[used.length - 1];
      const speed = `its speed is ${withUnit(plain(low.speed, U.speed, 1), U.speed)} at the lowest level and ` +
        `${withUnit(plain(high.speed, U.speed, 1), U.speed)} at the highest`;
      const how = { veering: "veers", backing: "backs" }[t.sense];
      if (!known(t.total)) said.push(`The total turning is not determined, because ${t.why}; ${speed}.`);
      else if (how) said.push(`From ${span(t.base, t.top)} the wind ${how} by ${pm(Math.abs(t.total), t.error, U.angle)} deg; ${speed}.`);
      else said.push(`From ${span(t.base, t.top)} the wind’s turning, ${pm(t.total, t.error, U.angle, true)} deg, is smaller than its error; ${speed}.`);
    }
    said.push(fit.verdict === "not determined"
      ? `Friction’s part is not determined, because ${fit.why}.`
      : `Friction turns the surface stress ${angle(fit, U)} deg toward low pressure${imposed(fit)} (${fit.verdict}${fit.why ? ": " + fit.why : ""}).`);
    const told = profile.thermal_wind.layers.filter((l) => l.sense === "warm" || l.sense === "cold");
    if (told.length) said.push(`The turning shows ${told.slice(0, 3).map((l) => `${l.sense} advection from ${span(l.base_height, l.top_height)}`).join("; ")}.`);
    return said;
  }

  // ---- pictures ------------------------------------------------------------------------------
  const SIZE = { width: 300, height: 380, left: 46, right: 10, top: 8, bottom: 40 };
  function frame(parent, title, key, label) {
    const figure = make(parent, "figure", { class: "panel" });
    const caption = make(figure, "figcaption", {}, title);
    make(caption, "span", { class: "key" }, key);
    const svg = d3.select(figure).append("svg").attr("viewBox", `0 0 ${SIZE.width} ${SIZE.height}`)
      .attr("role", "img").attr("aria-label", label);
    return { figure, svg };
  }
  function axes(svg, x, y, xUnit, yUnit, name) {
    svg.append("g").attr("transform", `translate(0,${SIZE.height - SIZE.bottom})`).call(d3.axisBottom(x).ticks(5));
    svg.append("g").attr("transform", `translate(${SIZE.left},0)`).call(d3.axisLeft(y).ticks(6));
    svg.append("text").attr("x", (SIZE.left + SIZE.width - SIZE.right) / 2).attr("y", SIZE.height - 6)
      .attr("text-anchor", "middle").text(withUnit(name, xUnit));
    svg.append("text").attr("x", 4).attr("y", SIZE.height - 6).text(yUnit[0]);
  }
  const path = (svg, points, x, y, cls) =>
    svg.append("path").attr("class", `line ${cls}`)
      .attr("d", d3.line().defined((p) => known(p[0]) && known(p[1])).x((p) => x(p[0])).y((p) => y(p[1]))(points));

  // Four panels over a common height, and the hodograph; returns a function that marks a height.
  function pictures(parent, data, U, top, onHeight) {
    const box = make(parent, "div", { class: "panels" });
    const points = data.points.filter((p) => p.there && p.z <= top);
    const y = d3.scaleLinear([0, top / U.height[1]], [SIZE.height - SIZE.bottom, SIZE.top]);
    const heights = d3.range(0, 101).map((i) => (Math.min(top, data.model ? data.model.top : top) * i) / 100);
    const fits = data.model ? heights.map((z) => [z, data.model.wind(z), data.model.balance(z)]) : [];
    const marks = [];
    const range = [SIZE.left, SIZE.width - SIZE.right];
    const scale = (values, zero) => {
      const kept = values.filter(known);
      let [a, b] = kept.length ? d3.extent(kept) : [0, 1];
      if (zero) { a = Math.min(a, 0); b = Math.max(b, 0); }
      if (a === b) { a -= 1; b += 1; }
      return d3.scaleLinear([a, b], range).nice(5);
    };
    const pointer = (svg) => svg.on("pointermove pointerdown", (event) => {
      const at = y.invert(d3.pointer(event)[1]) * U.height[1];
      if (at >= 0 && at <= top) onHeight(at);
    });
    const panel = (title, key, label, unit, name, lines, dots, zero) => {
      const { svg } = frame(box, title, key, label);
      const x = scale([...lines.flatMap((l) => l.points.map((p) => p[0])), ...dots.map((d) => d[0])], zero);
      axes(svg, x, y, unit, U.height, name);
      if (zero) svg.append("line").attr("class", "zero").attr("x1", x(0)).attr("x2", x(0)).attr("y1", SIZE.top).attr("y2", SIZE.height - SIZE.bottom);
      for (const line of lines) path(svg, line.points, x, y, line.cls);
      svg.append("g").selectAll("circle").data(dots).join("circle").attr("r", (d) => (d[2] ? 3 : 1.8))
        .attr("class", (d) => (d[2] ? "flagged" : "wind")).attr("cx", (d) => x(d[0])).attr("cy", (d) => y(d[1]));
      const rule = svg.append("line").attr("class", "here").attr("x1", range[0]).attr("x2", range[1]).attr("opacity", 0);
      marks.push((z) => rule.attr("opacity", z === null ? 0 : 1).attr("y1", y(z / U.height[1])).attr("y2", y(z / U.height[1])));
      pointer(svg);
      return { svg, x };
    };
    const s = U.speed[1], h = U.height[1];
    const sparse = points.length > 250 ? points.filter((p, i) => p.flags || i % Math.ceil(points.length / 250) === 0) : points;
    panel("Speed", data.model ? "measured: line with dots; fitted spiral: dashed; geostrophic: dotted" : "measured: line with dots; hollow: flagged",
      `Wind speed by height, from ${plain(d3.min(points, (p) => p.speed), U.speed, 1)} to ${plain(d3.max(points, (p) => p.speed), U.speed, 1)} ${U.speed[0]}`, U.speed, "speed,",
      [{ cls: "wind", points: points.filter((p) => !p.flags).map((p) => [p.speed / s, p.z / h]) },
        { cls: "fit", points: fits.map(([z, w]) => [Math.hypot(...w) / s, z / h]) },
        { cls: "balance", points: fits.map(([z, , g]) => [Math.hypot(...g) / s, z / h]) }],
      sparse.map((p) => [p.speed / s, p.z / h, p.flags]), true);
    const t = data.profile.turning;
    const unwound = (pairs) => { // continuous, near the measured curve
      let before = null;
      return pairs.map(([z, w]) => {
        let d = direction(...w);
        const near = before === null ? (data.used.length ? data.used[Math.floor(data.used.length / 2)].followed : d) : before;
        d = near + ((((d - near) % 360) + 540) % 360) - 180;
        before = d;
        return [d, z / h];
      });
    };
    panel("Direction (from)", `continuous through north; turning ${pm(t.total, t.error, U.angle, true)} deg, ${t.sense || "not determined"}`,
      "Wind direction by height as a continuous curve", U.angle, "direction,",
      [{ cls: "wind", points: points.filter((p) => known(p.followed)).map((p) => [p.followed, p.z / h]) },
        { cls: "fit", points: unwound(fits.filter(([z]) => z > 0).map(([z, w]) => [z, w])) }],
      sparse.filter((p) => known(p.followed)).map((p) => [p.followed, p.z / h, p.flags]), false);
    const gone = points.filter((p) => known(p.along));
    if (gone.length) {
      panel("Departure from balance", "along the isobars: line; across, toward low pressure positive: dashed",
        "Wind minus geostrophic wind by height", U.speed, "departure,",
        [{ cls: "wind", points: gone.map((p) => [p.along / s, p.z / h]) }, { cls: "across", points: gone.map((p) => [p.across / s, p.z / h]) }], [], true);
    } else withheld(box, "Departure from balance", data.profile.geostrophic.departure_why || data.profile.geostrophic.why || data.profile.coriolis.why);
    const layers = data.profile.thermal_wind.layers.filter((l) => known(l.advection) && l.base_height < top);
    if (layers.length) {
      const a = U.advection[1];
      const { svg, x } = panel("Temperature advection", "warming positive; bar: layer; cross-bar: one standard error",
        "Temperature advection by layer with errors", U.advection, "advection,",
        [], layers.flatMap((l) => [l.advection - l.error, l.advection + l.error].map((q) => [q / a, -1e9])), true);
      svg.selectAll("circle").remove();
      for (const l of layers) {
        const g = svg.append("g").attr("class", l.sense || "none");
        const mid = y((l.base_height + Math.min(l.top_height, top)) / 2 / h);
        g.append("line").attr("class", `bar ${l.sense || "none"}`).attr("x1", x(l.advection / a)).attr("x2", x(l.advection / a)).attr("y1", y(l.base_height / h)).attr("y2", y(Math.min(l.top_height, top) / h));
        g.append("line").attr("class", `error ${l.sense || "none"}`).attr("x1", x((l.advection - l.error) / a)).attr("x2", x((l.advection + l.error) / a)).attr("y1", mid).attr("y2", mid);
        if (l.sense && l.sense !== "none") g.append("text").attr("x", x(l.advection / a) + 4).attr("y", mid - 4).text(l.sense);
      }
    } else {
      const first = data.profile.thermal_wind.layers.find((l) => l.why);
      withheld(box, "Temperature advection", data.profile.coriolis.why || (first && first.why) || "no layer is covered by levels with wind and pressure");
    }
    marks.push(hodograph(box, data, U, points, fits));
    return (z) => marks.forEach((mark) => mark(z));
  }
  function withheld(box, title, why) {
    const figure = make(box, "figure", { class: "panel" });
    make(figure, "figcaption", {}, title);
    make(figure, "p", { class: "why" }, `Not determined, because ${why}.`);
  }
  function hodograph(box, data, U, points, fits) {
    const { svg } = frame(box, "Hodograph", "the wind as seen from above: right is toward east, up is toward north",
      "Hodograph: tip of the wind vector by height");
    const s = U.speed[1], used = points.filter((p) => !p.flags);
    const reach = 1.08 * Math.max(1e-6, ...used.map((p) => p.speed / s), ...fits.map(([, , g]) => Math.hypot(...g) / s));
    // One scale for both directions, or the turning would be drawn wrong.
    const side = Math.min(SIZE.width, SIZE.height) - 30, cx = SIZE.width / 2, cy = SIZE.height / 2 - 10;
    const r = d3.scaleLinear([0, reach], [0, side / 2]);
    const X = (u) => cx + r(1) * (u / s), Y = (v) => cy - r(1) * (v / s);
    for (const ring of r.ticks(4).filter((q) => q > 0)) {
      svg.append("circle").attr("class", "line zero").attr("cx", cx).attr("cy", cy).attr("r", r(ring));
      svg.append("text").attr("x", cx + 2).attr("y", cy - r(ring) - 2).text(withUnit(ring, U.speed));
    }
    const line = d3.line((p) => X(p[0]), (p) => Y(p[1]));
    svg.append("path").attr("class", "line wind").attr("d", line(used.map((p) => [p.u, p.v])));
    if (fits.length) {
      svg.append("path").attr("class", "line fit").attr("d", line(fits.map(([, w]) => w)));
      svg.append("path").attr("class", "line balance").attr("d", line([[0, 0], fits[0][2], fits[fits.length - 1][2]]));
    }
    const dot = svg.append("circle").attr("class", "here").attr("r", 5).attr("opacity", 0);
    return (z) => {
      const p = z === null ? null : nearest(used, z);
      dot.attr("opacity", p ? 1 : 0);
      if (p) dot.attr("cx", X(p.u)).attr("cy", Y(p.v));
    };
  }
  const nearest = (points, z) => points.reduce((best, p) => (best === null || Math.abs(p.z - z) < Math.abs(best.z - z) ? p : best), null);

  // ---- what stands at one height -------------------------------------------------------------
  function reading(data, U, z, flagNames) {
    const p = nearest(data.points.filter((q) => q.there), z);
    if (!p) return [];
    const rows = [["height", withUnit(plain(p.z, U.height), U.height)],
      ["speed", withUnit(plain(p.speed, U.speed, 1), U.speed)],
      ["from", known(p.direction) ? `${plain(p.direction, U.angle, 1)} deg` : "calm"]];
    if (known(p.turned)) rows.push(["turned since the lowest level", `${plain(p.turned, U.angle, 1, true)} deg`]);
    if (known(p.along)) rows.push(["departure along", withUnit(plain(p.along, U.speed, 1, true), U.speed)], ["across", withUnit(plain(p.across, U.speed, 1, true), U.speed)]);
    if (data.model && p.z <= data.model.top) {
      const w = data.model.wind(p.z);
      rows.push(["fit", `${withUnit(plain(Math.hypot(...w), U.speed, 1), U.speed)} from ${plain(direction(...w), U.angle, 1)} deg`]);
    }
    const names = Object.entries(flagNames).filter(([bit]) => p.flags & Number(bit)).map(([, name]) => name.replaceAll("_", " "));
    if (names.length) rows.push(["flags", names.join(", ")]);
    return rows;
  }

  // ---- tables --------------------------------------------------------------------------------
  function tables(parent, data, U) {
    const P = data.profile, fit = P.ekman;
    let s = section(parent, "Turning and strengthening", "turning");
    table(s, "By layer; veering, clockwise with height, is positive",
      [["from", U.height[0]], ["to", U.height[0]], ["turning", "deg"], ["rate", U.rate[0]], ["speed", U.speed[0]], ["sense", "", true]],
      P.turning.layers.map((l) => [plain(l.base, U.height), plain(l.top, U.height), pm(l.turning, l.error, U.angle, true),
        plain(l.rate, U.rate, 1, true), plain(l.speed_change, U.speed, 1, true), l.why ? `not determined, because ${l.why}` : l.sense]));
    s = section(parent, "Friction: Ekman spiral of constant viscosity", "friction");
    make(s, "p", {}, `${fit.verdict}${fit.why ? (fit.verdict === "not determined" ? ", because " : ": ") + fit.why : ""}`);
    if (fit.verdict !== "not determined") {
      const show = [["scale_height", "scale height", U.height], ["eddy_viscosity", "eddy viscosity", U.viscosity],
        ["geostrophic_eastward_wind", "geostrophic wind toward east", U.speed], ["geostrophic_northward_wind", "geostrophic wind toward north", U.speed],
        ["cross_isobar_angle", "cross-isobar angle", U.angle], ["friction_velocity", "friction velocity", ["m/s", 1]]];
      table(s, `Chosen member: ${fit.model}; 95 % intervals`, [["quantity", "", true], ["value ± one standard error", ""], ["interval", ""], ["unit", "", true]],
        show.map(([key, name, unit]) => [name, pm(fit[key], fit.errors[key], unit),
          fit.intervals[key] ? fit.intervals[key].map((q) => plain(q, unit, decimals((fit.errors[key] || 0) / unit[1]))).join(" to ") : "–", unit[0]]));
    }
    if (fit.candidates.length) {
      table(s, "Members compared; the least AICc is chosen", [["member", "", true], ["scale height", U.height[0]], ["cross-isobar angle", "deg"], ["misfit (rms)", U.speed[0]], ["AICc", ""]],
        fit.candidates.map((c) => [c.model, plain(c.parameters.scale_height, U.height), plain(c.parameters.cross_isobar_angle, U.angle), plain(c.rms, U.speed, 2), known(c.aicc) ? fixed(c.aicc, 1) : "–"]));
    }
    s = section(parent, "Distance from geostrophic balance", "balance");
    const shown = P.geostrophic.evidence.filter((e) => e.from !== "given" || known(e.eastward));
    table(s, "Evidence for the geostrophic wind, at the ground", [["from", "", true], ["speed", U.speed[0]], ["direction", "deg"], ["", "", true]],
      shown.map((e) => {
        if (!known(e.eastward)) return [e.from, "–", "–", `not determined, because ${e.why}`];
        const speed = Math.hypot(e.eastward, e.northward);
        return [e.from, pm(speed, e.error, U.speed), pm(direction(e.eastward, e.northward), (e.error / speed) * (180 / Math.PI), U.angle), e.from === P.geostrophic.chosen ? "used for the departure" : ""];
      }));
    make(s, "p", {}, known(P.geostrophic.friction_velocity)
      ? `Friction velocity ${pm(P.geostrophic.friction_velocity, P.geostrophic.friction_velocity_error, ["m/s", 1])} m/s, from the momentum integral.`
      : `Friction velocity not determined, because ${P.geostrophic.why}.`);
    s = section(parent, "Temperature advection from the thermal wind", "advection");
    table(s, "By layer; warming is positive", [["layer", "hPa"], ["above ground", U.height[0]], ["advection", U.advection[0]], ["gradient", U.gradient[0]], ["sense", "", true]],
      P.thermal_wind.layers.map((l) => [`${plain(l.base_pressure, U.pressure)}–${plain(l.top_pressure, U.pressure)}`, `${plain(l.base_height, U.height)}–${plain(l.top_height, U.height)}`,
        known(l.advection) ? pm(l.advection, l.error, U.advection, true) : "–",
        known(l.temperature_gradient_eastward) ? plain(Math.hypot(l.temperature_gradient_eastward, l.temperature_gradient_northward), U.gradient, 1) : "–",
        known(l.advection) ? l.sense : `not determined, because ${l.why}`]));
    s = section(parent, "Boundary layer", "boundary");
    const B = P.boundary_layer, list = make(s, "ul");
    make(list, "li", {}, known(B.bulk_richardson_depth) ? `Depth ${withUnit(plain(B.bulk_richardson_depth, U.height), U.height)}, by bulk Richardson number.` : `Depth not determined, because ${B.why}.`);
    for (const i of B.inversions) make(list, "li", {}, `Inversion, ${i.kind}: ${plain(i.base, U.height)} to ${withUnit(plain(i.top, U.height), U.height)}, ${fixed(i.strength, 1)} K warmer on top.`);
    make(list, "li", {}, known(B.jet.speed)
      ? `Wind maximum ${withUnit(plain(B.jet.speed, U.speed, 1), U.speed)} at ${withUnit(plain(B.jet.height, U.height), U.height)}, ${known(B.jet.falloff) ? `falling off by ${withUnit(plain(B.jet.falloff, U.speed, 1), U.speed)} above` : `falloff not determined, because ${B.jet.why}`}: ${B.jet.meets_criterion ? "a low-level jet" : "no low-level jet"} (${B.jet.criterion}).`
      : `Wind maximum not determined, because ${B.jet.why}.`);
    s = section(parent, "How the file was read", "reading");
    table(s, "Columns", [["column", "", true], ["read as", "", true], ["unit", "", true], ["why", "", true]],
      P.columns.map((c) => [c.column, c.read_as || "not used", c.unit || "", c.why]));
    if (P.remarks.length) {
      make(s, "h3", {}, "Remarks");
      const remarks = make(s, "ul");
      for (const remark of P.remarks) make(remarks, "li", {}, remark);
    }
  }

  // ---- one profile, whole --------------------------------------------------------------------
  function suggestedTop(data) {
    const last = data.used.length ? data.used[data.used.length - 1].z : 1000;
    const depth = data.profile.boundary_layer.bulk_richardson_depth;
    const wanted = Math.max(1000, known(depth) ? 2 * depth : 0, data.model ? 5 * data.model.scale : 0, last < 1000 ? 0 : 2000);
    return Math.min(last * 1.02, wanted);
  }
  // Draws one profile into a node; `options` has units, flags {bit: name} and a caution.
  function show(node, profile, options) {
    const U = UNITS[options.units], data = prepare(profile);
    empty(node);
    const words = make(node, "section", { "aria-label": "In short" });
    for (const sentence of sentences(data, U)) make(words, "p", { class: "lead" }, sentence);
    const drawing = section(node, "By height", "height");
    if (!data.used.length) {
      make(drawing, "p", {}, "No level has a usable wind.");
    } else {
      const last = data.used[data.used.length - 1].z;
      let top = options.top || suggestedTop(data);
      const choices = make(drawing, "fieldset", { class: "choices" });
      make(choices, "legend", {}, "Drawn up to");
      const held = make(drawing, "div");
      const point = make(drawing, "div", { class: "point" });
      const label = make(point, "label", {}, "Point at a height");
      const slider = make(label, "input", { type: "range", min: 0, max: data.used.length - 1, step: 1, value: 0 });
      const list = make(point, "dl", { "aria-live": "polite" });
      let mark = () => {};
      const at = (z) => {
        const p = nearest(data.used, z);
        slider.value = data.used.indexOf(p);
        slider.setAttribute("aria-valuetext", withUnit(plain(p.z, U.height), U.height));
        mark(p.z);
        empty(list);
        for (const [name, value] of reading(data, U, p.z, options.flags || {})) {
          const pair = make(list, "div");
          make(pair, "dt", {}, name);
          make(pair, "dd", {}, value);
        }
      };
      const draw = () => { empty(held); mark = pictures(held, data, U, top, at); at(data.used[slider.value].z); };
      slider.addEventListener("input", () => at(data.used[slider.value].z));
      const tops = [...new Set([suggestedTop(data), last * 1.02])];
      tops.forEach((value, i) => {
        const choice = make(choices, "label", {}, "");
        const radio = make(choice, "input", { type: "radio", name: "top", ...(value === top ? { checked: "" } : {}) });
        choice.append(` ${withUnit(plain(value, U.height), U.height)}${i ? ", the whole profile" : ""}`);
        radio.addEventListener("change", () => { top = value; draw(); });
      });
      draw();
    }
    tables(node, data, U);
  }
  return { show, prepare, model, UNITS, plain, pm, withUnit, make, empty, table, section, direction, known, sentences };
})();
