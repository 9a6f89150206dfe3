/* The desk: files in, corrections, sliders, comparison, exports. Loads after statement.js. */
"use strict";
(() => {
  const { make, empty, table, section, plain, pm, withUnit, UNITS, known, show, direction } = backveer;
  const node = (id) => document.getElementById(id);
  const FLAGS = {};
  const state = { uploads: [], current: null, compared: null, units: sessionStorage.units || "si", answers: {}, ticket: 0, job: null };

  // ---- talking to the server -----------------------------------------------------------------
  async function call(method, path, body, headers = {}) {
    let response;
    try {
      response = await fetch(path, { method, body, headers: { "X-Backveer": "desk", ...headers } });
    } catch {
      throw new Error("the desk does not answer; is the command still running?");
    }
    const data = await response.json();
    if (!response.ok) throw new Error(data.problem || `the desk answered ${response.status}`);
    return data;
  }
  const tell = (text, bad) => { node("say").textContent = text; node("say").className = bad ? "problem" : ""; };

  async function take(name, blob) {
    tell(`${name} is being read`);
    try {
      const { key } = await call("POST", "/files", blob, { "X-Name": encodeURIComponent(name) });
      const upload = { key, name, said: {} };
      state.uploads.push(upload);
      state.current = upload;
      list();
      await ask(upload);
    } catch (error) { tell(`${name}: ${error.message}`, true); }
  }
  // Ask for the answer; a later question makes an earlier answer stale.
  async function ask(upload) {
    const ticket = ++state.ticket;
    upload.said.shown = state.units;
    try {
      let data = await call("POST", `/files/${upload.key}/answer`, JSON.stringify(upload.said));
      while (data.job) {
        if (ticket !== state.ticket) { call("DELETE", `/jobs/${data.job}`).catch(() => {}); return; }
        state.job = data.job;
        node("work").hidden = false;
        node("done").value = data.done;
        data = await call("GET", `/jobs/${data.job}`);
      }
      if (ticket !== state.ticket) return;
      state.answers[upload.key] = data;
      tell("");
      draw();
    } catch (error) {
      if (ticket === state.ticket) tell(error.message, true);
    } finally {
      if (ticket === state.ticket) { node("work").hidden = true; state.job = null; }
    }
  }
  node("cancel").addEventListener("click", async () => {
    state.ticket++;
    node("work").hidden = true;
    if (state.job) await call("DELETE", `/jobs/${state.job}`).catch(() => {});
    tell("The work was cancelled.");
  });

  // ---- files ---------------------------------------------------------------------------------
  function list() {
    const open = empty(node("open"));
    for (const upload of state.uploads) {
      const item = make(open, "li");
      const button = make(item, "button", { type: "button", ...(upload === state.current ? { "aria-current": "true" } : {}) }, upload.name);
      button.addEventListener("click", () => { state.current = upload; list(); state.answers[upload.key] ? draw() : ask(upload); });
      const forget = make(item, "button", { type: "button", "aria-label": `Close ${upload.name}` }, "close");
      forget.addEventListener("click", async () => {
        await call("DELETE", `/files/${upload.key}`).catch(() => {});
        state.uploads = state.uploads.filter((u) => u !== upload);
        if (state.current === upload) state.current = state.uploads[0] || null;
        list();
        state.current ? (state.answers[state.current.key] ? draw() : ask(state.current)) : draw();
      });
    }
  }
  const files = (chosen) => [...chosen].forEach((file) => take(file.name, file));
  node("file").addEventListener("change", (event) => files(event.target.files));
  const drop = node("drop");
  drop.addEventListener("dragover", (event) => { event.preventDefault(); drop.classList.add("over"); });
  drop.addEventListener("dragleave", () => drop.classList.remove("over"));
  drop.addEventListener("drop", (event) => { event.preventDefault(); drop.classList.remove("over"); files(event.dataTransfer.files); });
  node("pasted").addEventListener("click", () => take("pasted table.txt", new Blob([node("paste").value])));

  // ---- the statement and what is said of the file ---------------------------------------------
  function draw() {
    const main = empty(node("main")), side = empty(node("said"));
    const upload = state.current;
    side.hidden = !upload;
    if (!upload) return;
    const data = state.answers[upload.key];
    if (!data) return;
    for (const f of data.failures) make(main, "p", { class: "problem" }, `${f.source}${f.line ? `, line ${f.line}` : ""}: ${f.problem}. ${f.remedy}.`);
    if (data.profile) {
      const p = data.profile, f = p.coriolis.coriolis_parameter;
      make(main, "h2", {}, `${p.station || p.source}${p.time ? ", " + p.time.replace("T", " ").replace("Z", " UTC") : ""}`);
      make(main, "p", { class: "quiet" }, `${known(p.latitude) ? `${Math.abs(p.latitude).toFixed(2)}° ${p.latitude < 0 ? "S" : "N"}` : "latitude not known"}${known(f) ? `; f = ${f.toExponential(3).replace("-", "−")} s⁻¹` : ""}`);
      if (data.profiles.length) many(main, upload, data);
      const held = make(main, "div", { "data-statement": "1" });
      paint(held, upload, data);
      extras(main, p.extras || {});
      comparison(main, upload);
    }
    controls(side, upload, data);
  }
  function paint(held, upload, data) {
    const trial = upload.trial;
    const profile = trial ? { ...data.profile, ekman: trialFit(data.profile, trial) } : data.profile;
    show(held, profile, { units: state.units, flags: FLAGS });
  }
  // The spiral that the sliders make: no slip or the fitted slip, turned and stretched with G.
  function trialFit(profile, trial) {
    const fit = profile.ekman, f = Math.abs(profile.coriolis.coriolis_parameter);
    const a = (trial.direction * Math.PI) / 180, G = trial.speed;
    const u = -G * Math.sin(a), v = -G * Math.cos(a);
    let slip = [-1, 0]; // departure at the ground over G, in the frame of G
    const fu = fit.geostrophic_eastward_wind, fv = fit.geostrophic_northward_wind;
    if (known(fu)) {
      const n = fu * fu + fv * fv, x = fit.departure_eastward_at_ground, y = fit.departure_northward_at_ground;
      slip = [(x * fu + y * fv) / n, (y * fu - x * fv) / n];
    }
    return {
      ...fit, verdict: "weakly determined", why: "set by hand", model: fit.model || "no slip",
      scale_height: Math.sqrt((2 * trial.viscosity) / f), eddy_viscosity: trial.viscosity,
      geostrophic_eastward_wind: u, geostrophic_northward_wind: v,
      geostrophic_eastward_shear: fit.geostrophic_eastward_shear || 0, geostrophic_northward_shear: fit.geostrophic_northward_shear || 0,
      departure_eastward_at_ground: slip[0] * u - slip[1] * v, departure_northward_at_ground: slip[0] * v + slip[1] * u,
      cross_isobar_angle: fit.cross_isobar_angle ?? 45, errors: {}, intervals: {}, top: fit.top || profile.turning.top, candidates: fit.candidates,
    };
  }
  function many(main, upload, data) {
    const label = make(main, "label", {}, `${data.profiles.length} profiles: `);
    const select = make(label, "select");
    data.profiles.forEach((l, i) => {
      const option = make(select, "option", { value: i }, `${i + 1}: ${l.time ? l.time.replace("T", " ").replace("Z", "") : l.station || ""}${known(l.turning) ? ` (${plain(l.turning, UNITS.si.angle, 0, true)} deg)` : ""}`);
      option.selected = i === data.index;
    });
    select.addEventListener("change", () => { upload.said.profile = Number(select.value); upload.trial = null; ask(upload); });
  }
  function extras(main, found) {
    const U = UNITS[state.units];
    if (found.rotor) {
      const r = found.rotor, s = section(main, "Across the rotor", "rotor");
      table(s, r.why || "The whole rotor is covered", [["quantity", "", true], ["value", ""], ["unit", "", true]], [
        ["hub speed", plain(r.hub_speed, U.speed, 2), U.speed[0]], ["hub direction", plain(r.hub_direction, U.angle, 1), "deg"],
        ["veer, top minus bottom", pm(r.veer, r.veer_error, U.angle, true), "deg"], ["shear exponent", plain(r.shear_exponent, U.ratio, 3, true), ""],
        ["equivalent speed", plain(r.equivalent_speed, U.speed, 2), U.speed[0]], ["equivalent speed with veer", plain(r.equivalent_speed_with_veer, U.speed, 2), U.speed[0]],
        ["air density", plain(r.air_density, ["kg/m³", 1], 3), "kg/m³"], ["rotor covered", plain(r.coverage, ["%", 0.01], 0), "%"]]);
      make(s, "p", { class: "caution" }, "Not a guarantee of load or energy; standards and licensed practice decide.");
    }
    if (found.runway) {
      const r = found.runway, s = section(main, `Along runway heading ${String(Math.round(r.heading)).padStart(3, "0")}`, "runway");
      table(s, r.why || "Between the ground and 2000 ft", [["quantity", "", true], ["value", ""], ["unit", "", true]], [
        ["largest loss of headwind on approach", plain(r.largest_loss, U.speed, 1), U.speed[0]], ["largest gain of headwind on approach", plain(r.largest_gain, U.speed, 1), U.speed[0]],
        ["strongest shear between levels", plain(r.shear, U.shear, 1), U.shear[0]], ["over", `${plain(r.base, U.height)} to ${plain(r.top, U.height)}`, U.height[0]], ["term of intensity", r.intensity || "none", ""]]);
      make(s, "p", { class: "caution" }, "Official warnings and pilot reports come first; licensed forecasters decide.");
    }
  }
  function comparison(main, upload) {
    const others = state.uploads.filter((u) => u !== upload && state.answers[u.key] && state.answers[u.key].profile);
    if (!others.length) return;
    const U = UNITS[state.units], s = section(main, "Compared with another", "compared");
    const label = make(s, "label", {}, "Other file: "), select = make(label, "select");
    make(select, "option", { value: "" }, "none");
    for (const u of others) { const o = make(select, "option", { value: u.key }, u.name); o.selected = u.key === state.compared; }
    const held = make(s, "div");
    const fill = () => {
      empty(held);
      const other = others.find((u) => u.key === select.value);
      state.compared = select.value;
      if (!other) return;
      const a = state.answers[upload.key].profile, b = state.answers[other.key].profile;
      const row = (name, get, unit) => [name, ...[a, b].map((p) => { const [x, e] = get(p); return pm(x, e, unit); }), unit[0]];
      table(held, "Side by side", [["quantity", "", true], [upload.name, ""], [other.name, ""], ["unit", "", true]], [
        row("total turning", (p) => [p.turning.total, p.turning.error], U.angle),
        row("scale height", (p) => [p.ekman.scale_height, p.ekman.errors.scale_height], U.height),
        row("cross-isobar angle", (p) => [p.ekman.cross_isobar_angle, p.ekman.errors.cross_isobar_angle], U.angle),
        row("geostrophic speed", (p) => [known(p.ekman.geostrophic_eastward_wind) ? Math.hypot(p.ekman.geostrophic_eastward_wind, p.ekman.geostrophic_northward_wind) : null, p.ekman.errors.geostrophic_eastward_wind], U.speed),
        row("friction velocity", (p) => [p.geostrophic.friction_velocity, p.geostrophic.friction_velocity_error], ["m/s", 1]),
        row("boundary-layer depth", (p) => [p.boundary_layer.bulk_richardson_depth, null], U.height)]);
    };
    select.addEventListener("change", fill);
    fill();
  }

  let waiting = null;
  const later = (upload) => { clearTimeout(waiting); waiting = setTimeout(() => ask(upload), 350); };
  function controls(side, upload, data) {
    const said = upload.said;
    const group = (words) => { const f = make(side, "fieldset"); make(f, "legend", {}, words); return f; };
    const field = (parent, words, key, hint = "", type = "text") => {
      const label = make(parent, "label", {}, words);
      const input = make(label, "input", { type, placeholder: hint, autocomplete: "off", inputmode: type === "text" ? "text" : "decimal" });
      input.value = said[key] ?? "";
      input.addEventListener("input", () => { said[key] = input.value; later(upload); });
      return input;
    };
    const shown = group("Units shown");
    for (const [key, words] of [["si", "SI"], ["aviation", "aviation (kt, ft)"]]) {
      const label = make(shown, "label", { class: "choice" }), radio = make(label, "input", { type: "radio", name: "shown", value: key });
      radio.checked = state.units === key;
      label.append(` ${words}`);
      radio.addEventListener("change", () => { state.units = sessionStorage.units = key; said.shown = key; draw(); });
    }
    const p = data.profile, place = group("The place");
    const now = (x, places) => (p && known(p[x]) ? p[x].toFixed(places) : "");
    field(place, "Latitude, north +", "latitude", now("latitude", 2));
    field(place, "Longitude, east +", "longitude", now("longitude", 2));
    field(place, "Elevation, m", "elevation", now("elevation", 0));
    field(place, "Time (ISO 8601)", "time", p && p.time ? p.time : "");
    if (p) {
      const columns = group("Columns");
      said.units = said.units || {};
      said.columns = said.columns || {};
      for (const c of p.columns) {
        make(columns, "h3", {}, c.column);
        const as = make(columns, "label", {}, "read as"), name = make(as, "input", { type: "text", placeholder: c.read_as || "not used", list: "quantities", "aria-label": `${c.column} read as` });
        name.value = Object.keys(said.columns).find((q) => said.columns[q] === c.column) || "";
        name.addEventListener("change", () => {
          for (const q of Object.keys(said.columns)) if (said.columns[q] === c.column) delete said.columns[q];
          if (name.value) said.columns[name.value] = c.column;
          ask(upload);
        });
        const of = make(columns, "label", {}, "unit"), unit = make(of, "input", { type: "text", placeholder: c.unit || "", "aria-label": `${c.column} unit` });
        unit.value = said.units[c.column] || "";
        unit.addEventListener("change", () => { if (unit.value) said.units[c.column] = unit.value; else delete said.units[c.column]; ask(upload); });
      }
      const names = make(columns, "datalist", { id: "quantities" });
      for (const q of ["height", "altitude", "geopotential_height", "air_pressure", "air_temperature", "dew_point_temperature", "relative_humidity", "wind_speed", "wind_from_direction", "eastward_wind", "northward_wind", "time"]) make(names, "option", { value: q });
    } else {
      const columns = group("A column or a unit");
      pair(columns, "read as (e.g. wind_speed)", "column header", (name, header) => { (said.columns ||= {})[name] = header; ask(upload); });
      pair(columns, "column or quantity", "unit (e.g. kt)", (name, unit) => { (said.units ||= {})[name] = unit; ask(upload); });
    }
    if (p && p.coriolis.applies) sliders(group("Try another spiral"), upload, data);
    if (p) {
      const balance = group("Geostrophic wind, where known");
      field(balance, "From, degrees", "geostrophic_direction");
      field(balance, "Speed, m/s", "geostrophic_speed");
      const rotor = group("A rotor");
      field(rotor, "Hub height, m", "hub_height");
      field(rotor, "Diameter, m", "rotor_diameter");
      const runway = group("A runway");
      field(runway, "True heading", "runway");
      const save = make(group("Save"), "div", { class: "row" });
      for (const [kind, words] of [["report.html", "report"], ["statement.json", "JSON"], ["mapping.toml", "mapping for --columns"]]) {
        make(save, "a", { href: `/files/${upload.key}/${kind}`, download: `${upload.name}.${kind}` }, words);
      }
      const show = make(save, "button", { type: "button" }, "the command");
      const code = make(save, "code", { "aria-live": "polite" });
      show.addEventListener("click", async () => { code.textContent = await (await fetch(`/files/${upload.key}/command.txt`)).text(); });
    }
  }
  function pair(parent, first, second, done) {
    const a = make(make(parent, "label", {}, first), "input", { type: "text" });
    const b = make(make(parent, "label", {}, second), "input", { type: "text" });
    make(parent, "button", { type: "button" }, "apply").addEventListener("click", () => a.value && b.value && done(a.value, b.value));
  }
  function sliders(parent, upload, data) {
    const fit = data.profile.ekman, found = fit.verdict !== "not determined";
    const g = found ? [fit.geostrophic_eastward_wind, fit.geostrophic_northward_wind]
      : data.profile.geostrophic.evidence.filter((e) => known(e.eastward)).map((e) => [e.eastward, e.northward])[0] || [0, 10];
    const start = { speed: Math.hypot(...g), direction: direction(...g), viscosity: found ? fit.eddy_viscosity : 5 };
    const U = UNITS[state.units], held = node("main");
    const again = make(parent, "button", { type: "button" }, found ? "back to the fitted values" : "back to no spiral");
    again.disabled = !upload.trial;
    const inputs = {};
    for (const [key, words, min, max, stepped, say] of [
      ["speed", "Geostrophic speed", 0, Math.max(40, 2 * start.speed), 0.1, (x) => withUnit(plain(x, U.speed, 1), U.speed)],
      ["direction", "Geostrophic direction", 0, 360, 1, (x) => `from ${x.toFixed(0)} deg`],
      ["viscosity", "Eddy viscosity (logarithmic)", -1, 3, 0.01, (x) => `${x.toPrecision(3)} m²/s`]]) {
      const label = make(parent, "label", { class: "stack" }), name = make(label, "span");
      const slider = make(label, "input", { type: "range", min, max, step: stepped, "aria-label": words });
      const put = (x) => { slider.value = key === "viscosity" ? Math.log10(x) : x; name.textContent = `${words}: ${say(x)}`; slider.setAttribute("aria-valuetext", say(x)); };
      put((upload.trial || start)[key]);
      inputs[key] = put;
      slider.addEventListener("input", () => {
        upload.trial = { ...(upload.trial || start), [key]: key === "viscosity" ? 10 ** slider.value : Number(slider.value) };
        put(upload.trial[key]);
        again.disabled = false;
        requestAnimationFrame(() => { const at = [...held.children].find((n) => n.dataset.statement); if (at) paint(at, upload, data); });
      });
    }
    again.addEventListener("click", () => { upload.trial = null; draw(); });
  }

  // ---- reloading loses nothing -----------------------------------------------------------------
  (async () => {
    try {
      Object.assign(FLAGS, (await call("GET", "/flags")));
      const kept = await call("GET", "/state");
      state.uploads = kept.uploads;
      const key = sessionStorage.current;
      state.current = state.uploads.find((u) => u.key === key) || state.uploads[state.uploads.length - 1] || null;
      list();
      if (state.current) await ask(state.current);
    } catch (error) { tell(error.message, true); }
  })();
  addEventListener("beforeunload", () => { if (state.current) sessionStorage.current = state.current.key; });
})();
