/* The report page: one or many profiles, units, provenance. Loads after statement.js. */
"use strict";
(() => {
  const { make, empty, table, section, plain, pm, withUnit, UNITS, known, show } = backveer;
  const data = JSON.parse(document.getElementById("data").textContent);
  const root = empty(document.getElementById("report"));
  const state = { units: data.units || "si", profile: 0 };
  const when = (p) => (p.time ? p.time.replace("T", " ").replace("Z", " UTC") : "");
  const name = (p) => p.station || p.source || "profile";
  const place = (p) => [known(p.latitude) ? `${Math.abs(p.latitude).toFixed(2)}° ${p.latitude < 0 ? "S" : "N"}` : "latitude not known",
    known(p.longitude) ? `${Math.abs(p.longitude).toFixed(2)}° ${p.longitude < 0 ? "W" : "E"}` : null,
    known(p.elevation) ? `${p.elevation.toFixed(0)} m above sea level` : null].filter(Boolean).join(", ");

  const header = make(root, "header");
  const title = make(header, "h1"), where = make(header, "p", { class: "quiet" });
  const choices = make(header, "fieldset", { class: "choices" });
  make(choices, "legend", {}, "Units");
  for (const [key, words] of [["si", "SI"], ["aviation", "aviation (kt, ft)"]]) {
    const label = make(choices, "label"), radio = make(label, "input", { type: "radio", name: "units", value: key });
    radio.checked = key === state.units;
    label.append(` ${words}`);
    radio.addEventListener("change", () => { state.units = key; draw(); });
  }
  const many = data.profiles.length > 1 ? make(root, "div") : null;
  const main = make(root, "main", { id: "main", tabindex: "-1" });
  const extra = make(root, "div");
  const foot = make(root, "footer");

  function draw() {
    const p = data.profiles[state.profile], f = p.coriolis;
    title.textContent = `${name(p)}${p.time ? ", " + when(p) : ""}`;
    where.textContent = `${place(p)}${known(f.coriolis_parameter) ? `; f = ${f.coriolis_parameter.toExponential(3).replace("-", "−")} s⁻¹, ` +
      (known(f.inertial_period) ? `inertial period ${(f.inertial_period / 3600).toFixed(1)} h` : "no inertial period") : ""}`;
    show(main, p, { units: state.units, flags: data.flags });
    if (many) overview();
  }
  // Time and height: speed as shade, turning since the lowest level as an arrow of its own.
  function overview() {
    const U = UNITS[state.units];
    empty(many);
    const s = section(many, `${data.profiles.length} profiles over time`, "overview");
    const rows = data.profiles.map((p, i) => ({ p, i, t: p.time ? new Date(p.time) : null })).filter((r) => r.t);
    if (rows.length > 1) picture(s, rows, U);
    const label = make(s, "label", {}, "Profile ");
    const select = make(label, "select");
    data.profiles.forEach((p, i) => {
      const option = make(select, "option", { value: i }, `${i + 1}: ${when(p) || name(p)}`);
      option.selected = i === state.profile;
    });
    select.addEventListener("change", () => { state.profile = Number(select.value); draw(); });
    const step = (by, words) => {
      const button = make(s, "button", { type: "button" }, words);
      button.disabled = !data.profiles[state.profile + by];
      button.addEventListener("click", () => { state.profile += by; draw(); });
    };
    step(-1, "earlier");
    step(1, "later");
    const shown = data.profiles.slice(0, 200);
    const details = make(s, "details");
    make(details, "summary", {}, `Table of ${shown.length === data.profiles.length ? "all" : "the first 200"}`);
    table(details, "Each profile: turning from the lowest to the highest level", [["profile", "", true], ["turning", "deg"], ["sense", "", true], ["friction’s spiral", "", true], ["cross-isobar angle", "deg"]],
      shown.map((p) => [when(p) || name(p), pm(p.turning.total, p.turning.error, U.angle, true), p.turning.sense || "–", p.ekman.verdict, plain(p.ekman.cross_isobar_angle, U.angle)]));
  }
  function picture(parent, rows, U) {
    const width = 900, height = 300, left = 50, right = 12, top = 10, bottom = 44;
    const box = make(parent, "figure", { class: "panel" });
    const caption = make(box, "figcaption", {}, "Speed and turning by time and height");
    make(caption, "span", { class: "key" }, "darker: stronger wind; each stroke leans by the turning since the lowest level (upright: none, to the right: veered). Click a time to see its profile.");
    const svg = d3.select(box).append("svg").attr("viewBox", `0 0 ${width} ${height}`).attr("role", "img").attr("aria-label", "Wind speed and turning by time and height");
    const tops = rows.map((r) => d3.max(r.p.levels.height.filter(known)) || 0);
    const roof = Math.min(d3.median(tops), 3000);
    const x = d3.scaleTime(d3.extent(rows, (r) => r.t), [left, width - right - 6]);
    const y = d3.scaleLinear([0, roof / U.height[1]], [height - bottom, top]);
    const thin = Math.ceil(rows.length / 400), kept = rows.filter((r, i) => i % thin === 0);
    const prepared = kept.map((r) => ({ ...r, data: backveer.prepare(r.p) }));
    const fastest = d3.max(prepared, (r) => d3.max(r.data.used.filter((p) => p.z <= roof), (p) => p.speed)) || 1;
    const wide = Math.max(1.5, (width - left - right) / kept.length);
    for (const r of prepared) {
      const used = r.data.used.filter((p) => p.z <= roof), every = Math.ceil(used.length / 24);
      used.filter((p, i) => i % every === 0).forEach((p, i, all) => {
        const next = all[i + 1] ? all[i + 1].z : Math.min(roof, p.z + (p.z - (all[i - 1] ? all[i - 1].z : p.z * 0.8)));
        svg.append("rect").attr("x", x(r.t)).attr("width", wide).attr("y", y(next / U.height[1])).attr("height", Math.max(0, y(p.z / U.height[1]) - y(next / U.height[1])))
          .attr("fill", "var(--wind)").attr("opacity", 0.06 + (0.9 * p.speed) / fastest);
      });
    }
    const strokes = Math.max(1, Math.ceil(prepared.length / 48));
    prepared.filter((r, i) => i % strokes === 0).forEach((r) => {
      const used = r.data.used.filter((p) => p.z <= roof && known(p.turned)), every = Math.ceil(used.length / 6);
      used.filter((p, i) => i % every === 0).forEach((p) => {
        const a = (p.turned * Math.PI) / 180, X = x(r.t) + wide / 2, Y = y(p.z / U.height[1]);
        svg.append("line").attr("class", "here").attr("x1", X).attr("y1", Y).attr("x2", X + 9 * Math.sin(a)).attr("y2", Y - 9 * Math.cos(a));
      });
    });
    svg.append("g").attr("transform", `translate(0,${height - bottom})`).call(d3.axisBottom(x).ticks(8));
    svg.append("g").attr("transform", `translate(${left},0)`).call(d3.axisLeft(y).ticks(6));
    svg.append("text").attr("x", 4).attr("y", height - 6).text(`${U.height[0]} above ground; strongest wind ${withUnit(plain(fastest, U.speed, 1), U.speed)}; time in UTC`);
    svg.on("click", (event) => {
      const t = x.invert(d3.pointer(event)[0]);
      state.profile = rows.reduce((best, r) => (Math.abs(r.t - t) < Math.abs(best.t - t) ? r : best)).i;
      draw();
    });
  }
  // Further answers of the command (rotor, shear, outlook): tables of their JSON, as it stands.
  for (const [key, words] of Object.entries(data.more || {})) {
    const s = section(extra, words.title, key);
    for (const t of words.tables) table(s, t.caption, t.head.map(([h, unit, word]) => [h, unit, word]), t.rows);
    for (const text of words.notes || []) make(s, "p", {}, text);
  }
  const s = section(foot, "Cautions and provenance", "provenance");
  for (const text of data.cautions) make(s, "p", { class: "caution" }, text);
  make(s, "p", { class: "quiet" }, `Backveer ${data.backveer}; options: ${data.options || "the defaults"}.`);
  for (const input of data.inputs) make(s, "p", { class: "quiet" }, `${input.source}, SHA-256 ${input.sha256 || "not kept"}`);
  for (const failure of data.failures) make(s, "p", { class: "caution" }, `Not read: ${failure.source}: ${failure.problem}. ${failure.remedy}.`);
  draw();
})();
