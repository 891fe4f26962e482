// Everything else: doubt, time courses, choices, comparison, species, findings, where numbers come from.
const value = (name, get, show = general, more = {}) => ({ name, number: true, get, show, ...more });
const text = (name, get, more = {}) => ({ name, get, ...more });

function doubtSection(root, state) {
  const found = DATA.doubt;
  if (found.words) root.append("p").text(printable(found.words));
  root.append("p").attr("class", "note").text(absent(found.samples) ? "" : `${found.samples} samples of all energies, seed ${found.seed}.`);
  const chart = figure(root, { title: "Doubt about the Arrhenius energy over temperature", about: "Bands of the Arrhenius energy. The table below has the values." });
  const q = found.quantiles ?? [], percent = q.map((v) => `${Number((100 * v).toPrecision(4))} %`);
  const bands = table(root, {
    caption: "Doubt",
    columns: [
      value("T / K", (r) => r.t, (v) => minus(String(v)), { head: true }),
      value("P(Eₐ < 0)", (r) => r.s.negative_energy?.value[r.k], share),
      value("±", (r) => r.s.negative_energy?.error[r.k], share),
      value("P(same answer)", (r) => r.s.same_answer?.value[r.k], share),
      ...percent.map((p, n) => value(`Eₐ, ${p}`, (r) => r.s.energy_bands_kj_mol?.[n]?.[r.k], energy)),
      ...percent.map((p, n) => value(`ln k, ${p}`, (r) => r.s.log_bands?.[n]?.[r.k], share)),
    ],
  });
  const narrow = table(root, {
    caption: "What would narrow it",
    columns: [
      text("Energy", (r) => r.name, { head: true }),
      value("share of the doubt of ln k", (r) => r.log_share?.[state.k], share),
      value("share of the doubt of Eₐ", (r) => r.energy_share?.[state.k], share),
    ],
  });
  chart.onWidth(draw);
  function draw() {
    const rate = found.rates[state.definition] ?? Object.values(found.rates)[0], s = rate?.samples ?? null;
    chart.box.attr("hidden", s ? null : "");
    bands(s ? DATA.temperature_k.map((t, k) => ({ t, k, s })) : [], `Doubt, rate ${DEFINITIONS[state.definition]}; Eₐ / kJ mol⁻¹`);
    narrow(Object.entries(rate?.narrowing ?? {}).map(([name, one]) => ({ name, ...one })), `What would narrow it at ${kelvin(state.t)}`);
    if (!s) return;
    const width = chart.width(), left = 66, right = width - 14, bottom = 230, canvas = chart.canvas, t = DATA.temperature_k;
    const x = reciprocal([left, right]), all = s.energy_bands_kj_mol;
    const y = d3.scaleLinear(padded(d3.extent([0, ...numbers(all)])), [bottom, 22]).nice();
    chart.size(width, bottom + 40);
    canvas.selectAll("*").remove();
    axis(canvas, d3.axisLeft(y).ticks(6).tickFormat((v) => minus(String(v))), left, 0, "Eₐ / kJ mol⁻¹", 2, 12);
    const sorted = d3.range(t.length).sort((a, b) => t[a] - t[b]);
    for (let n = 0; n < Math.floor(all.length / 2); n++) {
      canvas.append("path").attr("class", "band").attr("fill", "var(--p1)")
        .attr("d", d3.area().x((k) => x(t[k])).y0((k) => y(all[n][k])).y1((k) => y(all[all.length - 1 - n][k]))(sorted));
    }
    canvas.append("path").attr("class", "curve").attr("stroke", "var(--p1)").attr("d", line(t, all[Math.floor(all.length / 2)], x, y));
    canvas.append("line").attr("class", "zero").attr("x1", left).attr("x2", right).attr("y1", y(0)).attr("y2", y(0));
    temperatureAxis(canvas, x, bottom, width - 80, left, right);
    canvas.append("path").attr("class", "now").attr("d", `M${x(state.t)},22V${bottom}`);
    chart.below.text(`Median and bands between the quantiles ${percent.join(", ")} of the samples.`);
  }
  return draw;
}

function courseSection(root, state) {
  const { courses, words } = DATA.time_course;
  let number = 0;
  root.append("p").text(printable(words));
  const bar = root.append("div").attr("class", "choices");
  pick(bar, "Temperature of the course", courses.map((c, n) => [String(n), kelvin(c.temperature_k)]), "0", (v) => { number = Number(v); draw(); });
  const chart = figure(root, { title: "Concentrations over time", about: "Curves over the logarithm of time. The table below has the values." });
  const legend = chart.box.insert("ul", "figcaption").attr("class", "swatches").attr("aria-label", "Species");
  const most = [...Object.entries(courses[0].concentration_mol_l)].sort((a, b) => d3.max(b[1]) - d3.max(a[1])).slice(0, 7).map(([name]) => name);
  const fill = table(root, { caption: "Time course", columns: [
    value("t / s", (k) => courses[number].time_s[k], general, { head: true }),
    ...most.map((name) => value(`[${brief(name, 30)}] / mol L⁻¹`, (k) => courses[number].concentration_mol_l[name]?.[k])),
  ] });
  chart.onWidth(draw);
  function draw() {
    const course = courses[number], times = course.time_s, width = chart.width(), left = 76, right = width - 14, bottom = 260, canvas = chart.canvas;
    const later = d3.range(times.length).filter((k) => times[k] > 0);
    const x = d3.scaleLog(d3.extent(later, (k) => times[k]), [left, right]);
    const y = d3.scaleLinear([0, d3.max(most, (name) => d3.max(course.concentration_mol_l[name] ?? [0])) || 1], [bottom, 22]).nice();
    chart.size(width, bottom + 44);
    canvas.selectAll("*").remove();
    axis(canvas, d3.axisLeft(y).ticks(5).tickFormat(mark), left, 0, "concentration / mol L⁻¹", 2, 12);
    axis(canvas, d3.axisBottom(x).ticks(Math.max(2, width / 120)).tickFormat(mark), 0, bottom, "t / s", right, bottom + 36, "end");
    most.forEach((name, n) => canvas.append("path").attr("class", "curve").attr("stroke", colour(n)).attr("stroke-dasharray", ["none", "7 3", "2 3"][n % 3])
      .attr("d", d3.line().x((k) => x(times[k])).y((k) => y(course.concentration_mol_l[name]?.[k] ?? 0))(later)));
    swatches(legend, most.map((name, n) => [colour(n), name]));
    chart.below.text(`At ${kelvin(course.temperature_k)}; the species of which there is most.`);
    fill(d3.range(times.length), `Time course at ${kelvin(course.temperature_k)}`);
  }
  return draw;
}

function choicesSection(root, state) {
  const { alternatives, quantities } = DATA.choices;
  const ranks = ["rate", "barrier", "species"];
  const rows = [...quantities].sort((a, b) => ranks.indexOf(a.kind) - ranks.indexOf(b.kind))
    .flatMap((q) => alternatives.map((a, n) => ({ q, a, n })));
  const fill = table(root, { caption: "What each choice is worth", columns: [
    text("Of", (r) => r.q.name, { head: true }), text("Kind", (r) => r.q.kind), text("Quantity", (r) => r.q.unit ? `${r.q.quantity} / ${unit(r.q.unit)}` : r.q.quantity),
    text("Choice", (r) => r.a.choice), text("taken", (r) => r.a.taken), text("instead", (r) => r.a.instead),
    value("change", (r) => r.q.change[r.n]?.[state.k], share),
  ] });
  return () => fill(rows, `What each choice is worth at ${kelvin(state.t)}`);
}

function comparisonSection(root, state) {
  const found = DATA.comparison;
  root.append("p").text(printable(found.words));
  const at = (c, key) => { const k = c.temperature_k.indexOf(state.t); return k < 0 ? null : c[key]?.[k]; };
  const fill = table(root, { caption: "Measured and computed", columns: [
    text("Measured", (c) => c.name, { head: true }), text("rate", (c) => c.definition), text("unit of k", (c) => unit(c.unit)),
    value("k measured", (c) => at(c, "measured")), value("k computed", (c) => at(c, "computed")),
    value("Eₐ measured / kJ mol⁻¹", (c) => at(c, "measured_energy_kj_mol"), energy),
    value("Eₐ computed / kJ mol⁻¹", (c) => at(c, "arrhenius_energy_kj_mol"), energy),
  ] });
  const shifts = found.shifts && table(root, { caption: "By how much one energy alone would have to move", columns: [
    text("State", (s) => s.name, { head: true }), value("control", (s) => s.control, share),
    value("mean move / kJ mol⁻¹", (s) => s.mean_kj_mol, energy), value("left over, ln k", (s) => s.mean_rms, share),
  ] });
  return () => { fill(found.computed, `Measured and computed at ${kelvin(state.t)}`); shifts?.(found.shifts.states); };
}

function speciesSection(root, state) {
  const fill = table(root, { caption: "Species", columns: [
    text("Species", (s) => s.name, { head: true }), text("Kind", (s) => s.kind), text("made as", (s) => s.made_as),
    ...[["E / kJ mol⁻¹", "electronic_kj_mol", energy], ["zero point / kJ mol⁻¹", "zero_point_kj_mol", energy]].map(([n, key, show]) => value(n, (s) => s[key], show)),
    ...[["H / kJ mol⁻¹", "enthalpy_kj_mol", energy], ["S / J mol⁻¹ K⁻¹", "entropy_j_mol_k", entropy], ["G / kJ mol⁻¹", "gibbs_kj_mol", energy],
      ["C_p / J mol⁻¹ K⁻¹", "heat_capacity_j_mol_k", entropy], ["soft / kJ mol⁻¹", "low_mode_spread_kj_mol", energy]].map(([n, key, show]) => value(n, (s) => s[key]?.[state.k], show)),
    value("σ", (s) => s.symmetry_number, String), text("Files", (s) => (s.files ?? []).join(", ") || null, { long: true }),
  ], note: `Absolute, with the study's own treatment (${DATA.treatment.low_modes}) and standard state (${printable(DATA.standard_state)}).` });
  return () => fill(DATA.species, `Species at ${kelvin(state.t)}`);
}

function conformerSection(root, state) {
  const fill = table(root, { caption: "Conformers", columns: [
    text("Species", (r) => r.name, { head: true }), text("Member", (r) => r.m.file, { long: true }), value("degeneracy", (r) => r.m.degeneracy, String),
    value("G / kJ mol⁻¹", (r) => r.m.gibbs_kj_mol?.[state.k], energy), value("population", (r) => r.m.population?.[state.k], share),
  ] });
  const rows = DATA.conformers.ensembles.flatMap((e) => e.members.map((m) => ({ name: e.name, m })));
  return () => fill(rows, `Conformers at ${kelvin(state.t)}`);
}

// Any other part: its single numbers, and those of the chosen temperature where it runs over them.
function plainSection(key) {
  return (root, state) => {
    const part = DATA[key];
    if (part.words) root.append("p").text(printable(part.words));
    const fill = table(root, { caption: key, columns: [text("What", (r) => r[0], { head: true, long: true }), value("value", (r) => r[1], (v) => typeof v === "number" ? general(v, 6) : printable(v))] });
    return () => fill([...flat(part, "", part.temperature_k ?? DATA.temperature_k, state.t)], `At ${kelvin(state.t)}`);
  };
}
function* flat(one, name, temperatures, t) {
  const below = (key) => (name ? `${name} · ${key}` : String(key));
  if (absent(one) || name === "words" || /temperature_k$/.test(name)) return;
  if (Array.isArray(one)) {
    const single = one.every((v) => v === null || typeof v !== "object");
    if (single && one.length === temperatures.length) yield [name, one[temperatures.indexOf(t)]];
    else if (single) yield* one.map((v, n) => [below(n + 1), v]);
    else for (const [n, v] of one.entries()) yield* flat(v, below(v?.name ?? n + 1), temperatures, t);
  } else if (typeof one === "object") for (const [key, v] of Object.entries(one)) yield* flat(v, below(key), temperatures, t);
  else yield [name, one];
}

function findingSection(root) {
  const ranks = ["error", "warning", "note"];
  const fill = table(root, { caption: "Findings", columns: [
    text("Severity", (f) => f.severity, { head: true }), text("Finding", (f) => f.code), text("Where", place), text("What", (f) => f.what, { long: true }), text("Mend", (f) => f.mend, { long: true }),
  ] });
  return () => fill([...DATA.findings].sort((a, b) => ranks.indexOf(a.severity) - ranks.indexOf(b.severity)));
}

function sourceSection(root) {
  const shown = (v) => Array.isArray(v) ? `${v.flat(Infinity).length} numbers` : typeof v === "number" ? String(v) : printable(v);
  const rows = table(root, { caption: "Every number that the answers stand on", columns: [
    text("Of", (r) => r.of, { head: true }), text("Quantity", (r) => r.quantity, { long: true }), value("Value", (r) => r.value, shown),
    text("Unit", (r) => r.unit), text("Origin", (r) => r.origin), text("File and line", place),
  ], note: "printed: by the program that computed it; derived: from printed numbers; declared: in the study." });
  const files = table(root, { caption: "Files", columns: [
    text("File", (f) => f.path, { head: true }), text("Program", (f) => [f.program, f.program_version].filter(Boolean).join(" ") || null),
    text("Level", (f) => f.level), text("SHA-256", (f) => f.sha256, { long: true }),
  ] });
  return () => { rows(DATA.provenance); files(DATA.inputs); };
}
