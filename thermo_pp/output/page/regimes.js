// The map of regimes: over temperature and one held amount.
const MAPS = [
  ["approximation", "which approximation holds"], ["controlling", "which saddle controls"], ["resting", "where the material rests"],
  ["arrhenius_energy_kj_mol", "Eₐ / kJ mol⁻¹"], ["order", "order"], ["rate_constant", "rate constant"],
];

function regimeSection(root, state) {
  const found = DATA.regimes, amounts = found.amount, t = found.temperature_k;
  let key = "arrhenius_energy_kj_mol";
  const map = () => found.maps[state.definition] ?? Object.values(found.maps)[0];
  const name = () => found.maps[state.definition] ? state.definition : Object.keys(found.maps)[0];
  inWords(root, found.words);
  const bar = root.append("div").attr("class", "choices");
  pick(bar, "Coloured by", MAPS.filter(([k]) => Object.values(found.maps).some((m) => !absent(m[k]))), key, (value) => { key = value; draw(); });
  const chart = figure(root, { title: "Map of regimes", about: "Cells over temperature and amount. The table below has the values at the chosen temperature.",
    readout: "Point at a cell to read it." });
  const legend = chart.box.insert("ul", "output").attr("class", "swatches").attr("aria-label", "Colours");
  const fill = table(root, {
    caption: "Regimes",
    columns: [
      { name: `${printable(found.over)} / ${unit(found.unit)}`, number: true, head: true, show: general, get: (p) => p.amount },
      { name: "k", number: true, show: general, get: (p) => p.rate_constant },
      { name: "Eₐ / kJ mol⁻¹", number: true, show: energy, get: (p) => p.arrhenius_energy_kj_mol },
      { name: "order", number: true, show: share, get: (p) => p.order },
      { name: "Approximation", get: (p) => p.approximation },
      { name: "controlling", get: (p) => p.controlling },
      { name: "resting", get: (p) => p.resting },
    ],
  });
  chart.onWidth(draw);
  const point = (m, i, j) => ({ amount: amounts[j], ...Object.fromEntries(MAPS.map(([k]) => [k, m[k]?.[i]?.[j]])) });
  const say = (m, i, j) => {
    const p = point(m, i, j);
    return `${kelvin(t[i])}, ${general(p.amount)} ${unit(found.unit)} ${printable(found.over)}: k ${general(p.rate_constant)}, ` +
      `Eₐ ${energy(p.arrhenius_energy_kj_mol)} kJ/mol, order ${share(p.order)}; ${printable(p.approximation ?? "no approximation holds")}; ` +
      `${printable(p.controlling)} controls${absent(p.resting) ? "" : `; ${printable(p.resting)} rests`}`;
  };
  function draw() {
    const m = map(), values = m[key] ?? m.arrhenius_energy_kj_mol, at = t.indexOf(state.t);
    const width = chart.width(), left = 66, right = width - 10, top = 20, bottom = 300;
    const x = d3.scaleLinear(edges(t.map(Number)), [left, right]);
    const y = d3.scaleLog(edges(amounts.map(Math.log10)).map((v) => 10 ** v), [bottom, top]);
    const [paint, items] = painted(values);
    const cols = cuts([...t].sort(d3.ascending)), rows = cuts(amounts.map(Math.log10)).map((v) => 10 ** v);
    const order = d3.range(t.length).sort((a, b) => t[a] - t[b]), canvas = chart.canvas;
    chart.size(width, bottom + 44);
    canvas.selectAll("*").remove();
    const cells = order.flatMap((i, c) => amounts.map((_, j) => ({ i, j, c })));
    canvas.append("g").attr("shape-rendering", "crispEdges").selectAll("rect").data(cells).join("rect")
      .attr("x", (p) => x(cols[p.c])).attr("width", (p) => x(cols[p.c + 1]) - x(cols[p.c]) + 0.3)
      .attr("y", (p) => y(rows[p.j + 1])).attr("height", (p) => y(rows[p.j]) - y(rows[p.j + 1]) + 0.3)
      .attr("fill", (p) => paint(values[p.i][p.j]))
      .on("mouseenter", (_, p) => chart.said.text(say(m, p.i, p.j)));
    const zeros = m.sign_changes.flatMap((list, j) => list.map((c) => ({ t: c.temperature_k, a: amounts[j] })));
    canvas.append("g").selectAll("circle").data(zeros).join("circle").attr("r", 3.5).attr("cx", (p) => x(p.t)).attr("cy", (p) => y(p.a))
      .attr("fill", "var(--card)").attr("stroke", "var(--ink)").attr("stroke-width", 1.5);
    if (at >= 0) canvas.append("rect").attr("class", "now").attr("x", x(cols[order.indexOf(at)])).attr("y", top)
      .attr("width", x(cols[order.indexOf(at) + 1]) - x(cols[order.indexOf(at)])).attr("height", bottom - top);
    const decades = d3.ticks(Math.ceil(Math.log10(amounts[0])), Math.floor(Math.log10(amounts[amounts.length - 1])), 6).filter(Number.isInteger);
    axis(canvas, d3.axisLeft(y).tickValues(decades.length ? decades.map((v) => 10 ** v) : [amounts[0], amounts[amounts.length - 1]])
      .tickFormat(mark), left, 0, `${brief(found.over, 20)} / ${unit(found.unit)}`, 2, 12);
    axis(canvas, d3.axisBottom(x).ticks(Math.max(2, Math.min(8, width / 90))), 0, bottom, "T / K", right, bottom + 36, "end");
    swatches(legend, items);
    chart.below.text(`${MAPS.find(([k]) => k === key)[1]}, rate ${DEFINITIONS[name()]}, with the study's own soft-mode treatment.` + (zeros.length ? " Circles: Eₐ changes its sign." : ""));
    if (at >= 0) fill(amounts.map((_, j) => point(m, at, j)), `Regimes at ${kelvin(state.t)}, rate ${DEFINITIONS[name()]}`);
  }
  function painted(values) {
    const flat = values.flat();
    const found = numbers(flat);
    if (found.length === 0) {
      const names = [...new Set(flat.map((v) => v ?? ""))];
      return [(v) => v ? colour(names.filter(Boolean).indexOf(v)) : "var(--line)",
        names.map((v) => [v ? colour(names.filter(Boolean).indexOf(v)) : "var(--line)", v || "none"])];
    }
    const [low, high] = d3.extent(found);
    const log = key === "rate_constant" && low > 0 && high / low > 100;
    const most = Math.max(Math.abs(low), Math.abs(high)) || 1;
    const scale = key === "arrhenius_energy_kj_mol" && low < 0 && high > 0
      ? d3.scaleDiverging([-most, 0, most], d3.interpolatePuOr).clamp(true)
      : (log ? d3.scaleSequentialLog : d3.scaleSequential)([low, high === low ? low + 1 : high], d3.interpolateCividis);
    const shown = low === high ? [low] : log ? d3.range(5).map((n) => low * (high / low) ** (n / 4)) : d3.range(5).map((n) => low + (high - low) * n / 4);
    return [(v) => absent(v) ? "var(--line)" : scale(v), shown.map((v) => [scale(v), general(v, 3)])];
  }
  return draw;
}

// Borders between grid points, half-way, and the outer two.
function cuts(values) {
  if (values.length === 1) return [values[0] - 0.5, values[0] + 0.5];
  const inner = d3.pairs(values).map(([a, b]) => (a + b) / 2);
  return [2 * values[0] - inner[0], ...inner, 2 * values[values.length - 1] - inner[inner.length - 1]];
}
const edges = (values) => { const all = cuts([...values].sort(d3.ascending)); return [all[0], all[all.length - 1]]; };
