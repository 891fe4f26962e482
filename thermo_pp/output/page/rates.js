// Rates: the constant and its Arrhenius energy over temperature, windows of approximations, controls, steps.
const DEFINITIONS = {
  per_pool: "per pool (reactant and intermediates)", per_free_reactant: "per free reactant",
  cycle: "turnover of the catalyst", relaxation: "relaxation to equilibrium",
};
const CONTROL = 0.001;
const definitions = (barrier) => Object.keys(DEFINITIONS).filter((name) => barrier.rates[name]);

function barrierSection(root, state) {
  const facts = root.append("dl").attr("class", "facts");
  const chart = figure(root, {
    title: "Rate constant, Arrhenius energy and windows of approximations over temperature",
    about: "Three panels over the same temperatures. The tables below have the values.",
    readout: "Point at a curve to read it at the nearest temperature.",
  });
  const over = table(root, {
    caption: "Rate over temperature", mark: (k) => k,
    columns: [
      { name: "T / K", number: true, head: true, get: (k) => DATA.temperature_k[k], show: (v) => minus(String(v)) },
      { name: "k", number: true, show: general, get: (k) => state.rate().rate_constant[k] },
      ...[["Eₐ / kJ mol⁻¹", "arrhenius_energy_kj_mol", energy], ["H‡ / kJ mol⁻¹", "activation_enthalpy_kj_mol", energy],
        ["S‡ / J mol⁻¹ K⁻¹", "activation_entropy_j_mol_k", entropy], ["G‡ / kJ mol⁻¹", "activation_gibbs_kj_mol", energy]]
        .map(([name, key, show]) => ({ name, number: true, show, get: (k) => state.rate()[key]?.[k] })),
      ...[["H‡° / kJ mol⁻¹", "activation_enthalpy_kj_mol", energy], ["S‡° / J mol⁻¹ K⁻¹", "activation_entropy_j_mol_k", entropy],
        ["G‡° / kJ mol⁻¹", "activation_gibbs_kj_mol", energy]]
        .map(([name, key, show]) => ({ name, number: true, show, get: (k) => state.rate().standard_activation?.[key]?.[k] })),
    ],
    note: "H‡, S‡ and G‡ are of the constant at the concentrations held; with ° against the standard state of the study. The soft-mode treatment is the one chosen above; rates do not depend on the choice of standard state.",
  });
  const near = table(root, {
    caption: "Approximations",
    columns: [
      { name: "Approximation", head: true, get: (a) => a.name },
      { name: "within 5 %", get: (a) => windowsText(a), long: true },
      { name: "ratio to the exact constant", number: true, show: general, get: (a) => a.ratio[state.k] },
      { name: "k", number: true, show: general, get: (a) => a.rate_constant[state.k] },
    ],
  });
  chart.onWidth(draw);
  const words = inWords(root, "");

  function draw() {
    const rate = state.rate(), barrier = state.barrier();
    const more = (name, value, about) => ({ name, value, about });
    const list = [
      more(`k at ${kelvin(state.t)}`, general(rate.rate_constant[state.k], 4), unit(rate.unit)),
      more(`Eₐ at ${kelvin(state.t)}`, energy(rate.arrhenius_energy_kj_mol[state.k]), "kJ mol⁻¹"),
      more("G‡ at the concentrations held", energy(rate.activation_gibbs_kj_mol?.[state.k]), "kJ mol⁻¹"),
      ...(rate.resting_state ? [more("Resting state", printable(rate.resting_state[state.k]), "")] : []),
      ...rate.sign_changes.map((c) => more("Eₐ changes its sign at", `${degree(c.temperature_k)} K`, `${c.kind} of the rate`)),
    ];
    const boxes = facts.selectAll("div").data(list).join((enter) => {
      const box = enter.append("div");
      box.append("dt");
      box.append("dd").append("span");
      box.select("dd").append("small");
      return box;
    });
    boxes.select("dt").text((f) => f.name);
    boxes.select("dd span").text((f) => f.value);
    boxes.select("dd small").text((f) => ` ${f.about}`);
    words.text(printable(barrier.words));
    curves(chart, rate, state);
    chart.below.text(`${printable(barrier.net_reaction)}, ${DEFINITIONS[state.definition]}; soft modes ${barrier.low_modes}. Bars: where an approximation stays within 5 % of the exact constant; a bar without an end mark goes on beyond the temperatures of the study.`);
    over(d3.range(DATA.temperature_k.length), `Rate ${DEFINITIONS[state.definition]}: ${barrier.net_reaction}; k / ${unit(rate.unit)}`);
    near(rate.approximations, `Approximations of the rate ${DEFINITIONS[state.definition]} at ${kelvin(state.t)}`);
  }
  return draw;
}

const windowsText = (a) => a.windows_k.length === 0 ? "nowhere" : a.windows_k.map(([from, to], n) => {
  const [below, above] = a.windows_open[n];
  if (below && above) return `throughout ${degree(from)} to ${degree(to)} K`;
  if (below) return `up to ${degree(to)} K`;
  return above ? `from ${degree(from)} K` : `${degree(from)} to ${degree(to)} K`;
}).join(", ");

function curves(chart, rate, state) {
  const width = chart.width(), left = 66, right = width - 14, t = DATA.temperature_k;
  const near = rate.approximations, tall = 150, gap = 34, row = 34;
  const second = 22 + tall + gap, third = second + tall + gap + 6;
  const height = (near.length ? third + near.length * row : second + tall + 8) + 40;
  const x = reciprocal([left, right]), canvas = chart.canvas;
  chart.size(width, height);
  canvas.selectAll("*").remove();
  const energies = rate.arrhenius_energy_kj_mol, constants = rate.rate_constant;
  const positive = numbers(constants).filter((v) => v > 0);
  const [low, high] = d3.extent(positive);
  if (positive.length) {
    const y = d3.scaleLog(low === high ? [low / 2, high * 2] : [low / 1.2, high * 1.2], [22 + tall, 22]);
    const decades = y.ticks(5).filter((v) => Number.isInteger(Math.log10(v)) || high / low < 20);
    axis(canvas, d3.axisLeft(y).tickValues(decades.length ? decades.filter((_, n) => n % Math.ceil(decades.length / 6) === 0) : [low, high])
      .tickFormat(mark), left, 0, `k / ${unit(rate.unit)}`, 2, 12);
    canvas.append("path").attr("class", "curve").attr("stroke", "var(--p0)").attr("d", line(t, constants, x, y));
    dots(constants, y, "var(--p0)", "k");
  }
  const y = d3.scaleLinear(padded(d3.extent([0, ...numbers(energies)])), [second + tall, second]).nice();
  axis(canvas, d3.axisLeft(y).ticks(5).tickFormat((v) => minus(String(v))), left, 0, "Eₐ / kJ mol⁻¹", 2, second - 10);
  canvas.append("line").attr("class", "zero").attr("x1", left).attr("x2", right).attr("y1", y(0)).attr("y2", y(0));
  canvas.append("path").attr("class", "curve").attr("stroke", "var(--p1)").attr("d", line(t, energies, x, y));
  dots(energies, y, "var(--p1)", "E");
  near.forEach((a, n) => {
    const at = third + n * row, ends = [left, right];
    canvas.append("text").attr("x", left).attr("y", at + 10).text(printable(a.windows_k.length ? a.name : `${a.name}: nowhere`)).call(fit, right - left);
    canvas.append("path").attr("d", `M${left},${at + 20}H${right}`).attr("stroke", "var(--line)").attr("stroke-width", 6);
    a.windows_k.forEach(([from, to], m) => {
      const [below, above] = a.windows_open[m];
      const hot = above ? Math.min(...ends) : x(to), cold = below ? Math.max(...ends) : x(from);
      canvas.append("path").attr("d", `M${hot},${at + 20}H${cold}`).attr("stroke", "var(--p2)").attr("stroke-width", 6);
      for (const end of [...(above ? [] : [hot]), ...(below ? [] : [cold])]) {
        canvas.append("path").attr("d", `M${end},${at + 14}v12`).attr("stroke", "var(--ink)").attr("stroke-width", 2);
      }
    });
  });
  temperatureAxis(canvas, x, height - 40, width - 80, left, right);
  canvas.append("path").attr("class", "now").attr("d", `M${x(state.t)},22V${height - 40}`);
  function dots(values, scale, fill, letter) {
    canvas.append("g").selectAll("circle").data(d3.range(t.length).filter((k) => !absent(values[k]) && Number.isFinite(scale(values[k])))).join("circle")
      .attr("cx", (k) => x(t[k])).attr("cy", (k) => scale(values[k])).attr("r", (k) => k === state.k ? 6 : t.length > 60 ? 1.5 : 3).attr("fill", fill)
      .attr("data-value", (k) => values[k]).attr("data-of", letter);
  }
  chart.svg.on("mousemove", (event) => {
    const [at] = d3.pointer(event);
    const k = d3.least(d3.range(t.length), (n) => Math.abs(x(t[n]) - at));
    chart.said.text(`${kelvin(t[k])}: k ${general(constants[k])} ${unit(rate.unit)}, Eₐ ${energy(energies[k])} kJ/mol`);
  });
}

function stepSection(root, state) {
  const fill = table(root, {
    caption: "Steps",
    columns: [
      { name: "Step", head: true, get: (s) => s.equation },
      { name: "k forward", number: true, show: general, get: (s) => s.forward_rate_constant?.[state.k] },
      { name: "unit", get: (s) => unit(s.forward_unit ?? "") },
      { name: "k back", number: true, show: general, get: (s) => s.reverse_rate_constant?.[state.k] },
      { name: "unit", get: (s) => unit(s.reverse_unit ?? "") },
      { name: "reversibility", number: true, show: share, get: (s) => s.reversibility?.[state.k] },
      { name: "encounter limit", get: (s) => absent(s.limited?.[state.k]) ? null : s.limited[state.k] ? "yes" : "no" },
      { name: "tunnelling", get: (s) => s.tunnelling },
    ],
  });
  return () => fill(state.barrier().steps, `Steps at ${kelvin(state.t)}, soft modes ${state.barrier().low_modes}`);
}

function controlSection(root, state) {
  const chart = figure(root, {
    title: "Control of the rate by each state", about: "Bars to the right: lowering the energy of the state speeds the reaction up. The table below has the values.",
  });
  const fill = table(root, {
    caption: "Control",
    columns: [
      { name: "State or step", head: true, get: (c) => c.name },
      { name: "What", get: (c) => c.what },
      { name: "control or order", number: true, show: share, get: (c) => c.value },
      { name: "move / kJ mol⁻¹", number: true, show: energy, get: (c) => c.move },
    ],
    note: "Control: d ln k/d(−G/RT) of each state. move: of the energy of one state, which would bring Eₐ to zero.",
  });
  chart.onWidth(draw);
  function draw() {
    const rate = state.rate(), saddles = new Set(DATA.mechanism.saddles), species = new Set(DATA.mechanism.steps.flatMap((s) => Object.keys({ ...s.reactants, ...s.products })));
    const rows = Object.entries(rate.control).map(([name, values]) => ({
      name, value: values[state.k], move: rate.sign_shift_kj_mol[name]?.[state.k], values,
      what: saddles.has(name) ? "saddle point" : species.has(name) ? "state" : "step without a saddle",
    }));
    const orders = Object.entries(rate.orders ?? {}).map(([name, values]) => ({ name, what: "order in it", value: values[state.k] }));
    const counting = rows.filter((r) => Math.abs(r.value) >= CONTROL).sort((a, b) => Math.abs(b.value) - Math.abs(a.value)).slice(0, 20);
    fill([...rows, ...orders], `Control of the rate ${DEFINITIONS[state.definition]} at ${kelvin(state.t)}`);
    chart.below.text(`Control at ${kelvin(state.t)}, rate ${DEFINITIONS[state.definition]}; states below ${CONTROL} are in the table only.`);
    const width = chart.width(), row = 30, height = counting.length * row + 40, room = Math.max(110, Math.min(190, width * 0.3));
    const [low, high] = d3.extent([0, ...numbers(counting.map((r) => r.values))]);
    const x = d3.scaleLinear([low, high], [room + 48, width - 48]), canvas = chart.canvas;
    chart.size(width, height);
    canvas.selectAll("*").remove();
    canvas.append("line").attr("class", "zero").attr("x1", x(0)).attr("x2", x(0)).attr("y1", 0).attr("y2", height - 36);
    const groups = canvas.selectAll("g.control").data(counting).join("g").attr("class", "control").attr("transform", (_, n) => `translate(0,${n * row})`);
    groups.append("text").attr("x", room - 8).attr("y", 19).attr("text-anchor", "end")
      .text((r) => printable(r.name) + (r.what === "saddle point" ? " ‡" : "")).call(fit, room - 10);
    groups.append("rect").attr("class", (r) => r.value < 0 ? "bar minus" : "bar").attr("y", 6).attr("height", 18)
      .attr("x", (r) => Math.min(x(0), x(r.value))).attr("width", (r) => Math.max(1, Math.abs(x(r.value) - x(0))));
    groups.append("text").attr("class", "halo").attr("y", 19).attr("x", (r) => x(r.value) + (r.value < 0 ? -5 : 5))
      .attr("text-anchor", (r) => r.value < 0 ? "end" : "start").text((r) => share(r.value));
    canvas.append("g").attr("class", "axis").attr("transform", `translate(0,${height - 34})`)
      .call(d3.axisBottom(x).ticks(Math.max(3, Math.min(8, width / 90))).tickFormat((v) => minus(String(v))));
  }
  return draw;
}
