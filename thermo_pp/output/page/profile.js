// The profile: levels of G (full) and H (dashed) of every state, their labels apart, and the table.
const ALL = "all";
const LEVEL = 44; // width of a level; its labels stand to the right of it

function profileSection(root, state) {
  const paths = [...new Set(DATA.profiles.flatMap((p) => p.states.map((s) => s.path)))];
  let path = paths.length <= 6 ? ALL : paths[0];
  let shown = "both";
  const why = root.append("p").attr("class", "why");
  const bar = root.append("div").attr("class", "choices");
  pick(bar, "Path", [[ALL, `all ${paths.length} paths`], ...paths.map((p) => [p, p])], path,
    (value) => { path = value; draw(); });
  pick(bar, "Levels", [["both", "G, with H dashed"], ["gibbs_kj_mol", "G alone"], ["enthalpy_kj_mol", "H alone"]], shown,
    (value) => { shown = value; draw(); });
  const chart = figure(root, {
    title: "Profile along the mechanism", focusable: true,
    about: "Levels of the states, in the order of each path. The table below has every value.",
    readout: "Point at a level, or move to it with Tab, to read its values.",
  });
  const legend = chart.box.insert("ul", "output").attr("class", "swatches").attr("aria-label", "Paths");
  const fill = table(root, {
    caption: "Profile", mark: (s) => `${s.path}|${s.state}`,
    columns: [
      { name: "Path", get: (s) => s.path, head: true },
      { name: "State", get: (s) => s.state },
      { name: "Kind", get: (s) => s.kind },
      ...[["H / kJ mol⁻¹", "enthalpy_kj_mol", energy], ["S / J mol⁻¹ K⁻¹", "entropy_j_mol_k", entropy],
        ["G / kJ mol⁻¹", "gibbs_kj_mol", energy], ["soft / kJ mol⁻¹", "low_mode_spread_kj_mol", energy]]
        .map(([name, key, show]) => ({ name, number: true, show, get: (s) => s[key]?.[state.k] })),
    ],
    note: "All against the reference state. soft: largest less smallest G over the four treatments of soft modes.",
  });
  chart.onWidth(draw);

  function draw() {
    const profile = state.profile();
    const states = profile.states.filter((s) => path === ALL || s.path === path);
    const against = `${profile.at === "conditions" ? "concentrations held" : profile.standard_state}, ${profile.low_modes}`;
    chart.below.text(`Against ${printable(profile.reference)}; ${against}; ${kelvin(state.t)}. ` +
      (shown === "both" ? "Full levels: G. Dashed levels: H. The dotted distance between them is what entropy takes. " : "") +
      "The scale is the same at every temperature.");
    draw_levels(chart, legend, states, paths, state.k, shown);
    fill(states, `Profile at ${kelvin(state.t)}, ${against}`);
    why.text(reason(profile, state)).attr("hidden", reason(profile, state) ? null : "");
  }
  return draw;
}

// Where the saddle that controls most stands, in words.
function reason(profile, state) {
  const rate = state.rate();
  if (!rate) return "";
  const saddles = DATA.mechanism.saddles.filter((s) => !absent(rate.control[s]?.[state.k]));
  const saddle = d3.greatest(saddles, (s) => rate.control[s][state.k]);
  const at = profile.states.find((s) => s.kind === "saddle" && saddle in s.species);
  if (!at) return "";
  const h = at.enthalpy_kj_mol[state.k], g = at.gibbs_kj_mol[state.k], e = rate.arrhenius_energy_kj_mol[state.k];
  const so = h < 0 && g > 0 && e < 0
    ? " It lies below the start in enthalpy and above it in free energy: entropy alone holds the reaction back, more so on heating, and the Arrhenius energy is negative."
    : "";
  return `At ${kelvin(state.t)} ${printable(saddle)} controls the rate most. It stands at H ${energy(h)} and G ` +
    `${energy(g)} kJ/mol against ${printable(profile.reference)}; E\u2090 is ${energy(e)} kJ/mol.${so}`;
}

function nodesOf(states, paths) {
  const byPath = d3.group(states, (s) => s.path);
  const slots = d3.max(byPath.values(), (list) => list.length);
  const nodes = new Map(), links = new Map();
  for (const [path, list] of byPath) {
    let before = null;
    list.forEach((s, k) => {
      const slot = k === list.length - 1 ? slots - 1 : k;
      const key = `${slot}|${s.state}`;
      const node = nodes.get(key) ?? { key, slot, s, paths: [] };
      node.paths.push(paths.indexOf(path));
      nodes.set(key, node);
      if (before) {
        const link = links.get(`${before.key}>${key}`) ?? { from: before, to: node, paths: [] };
        link.paths.push(paths.indexOf(path));
        links.set(`${before.key}>${key}`, link);
      }
      before = node;
    });
  }
  return { nodes: [...nodes.values()], links: [...links.values()], slots, paths: [...byPath.keys()] };
}

function draw_levels(chart, legend, states, paths, k, shown) {
  const kinds = shown === "both" ? ["enthalpy_kj_mol", "gibbs_kj_mol"] : [shown];
  const main = kinds[kinds.length - 1], letter = main === "gibbs_kj_mol" ? "G" : "H";
  const { nodes, links, slots, paths: drawn } = nodesOf(states, paths);
  const width = Math.max(chart.width(), 60 + slots * 122), step = (width - 56) / slots;
  const most = d3.max(d3.rollup(nodes, (list) => list.length, (n) => n.slot).values()) ?? 1;
  const labelled = most <= 14;
  const height = Math.max(430, labelled ? most * (kinds.length === 2 ? 54 : 36) + 60 : 430);
  const top = 22, bottom = height - 18;
  const y = d3.scaleLinear(padded(d3.extent([0, ...numbers(states.flatMap((s) => kinds.map((q) => s[q])))]), 0.08), [bottom, top]).nice();
  const x = (n) => 56 + n.slot * step + LEVEL / 2;
  const ink = (one) => one.paths.length > 1 && drawn.length > 1 ? "var(--ink)" : colour(one.paths[0]);
  chart.size(width, height);
  const canvas = chart.canvas;
  const focused = document.activeElement?.getAttribute?.("data-node") ?? null;
  canvas.selectAll("*").remove();
  canvas.append("g").attr("class", "grid").selectAll("line").data(y.ticks(8)).join("line")
    .attr("x1", 48).attr("x2", width - 4).attr("y1", y).attr("y2", y);
  axis(canvas, d3.axisLeft(y).ticks(8).tickFormat((v) => minus(String(v))), 48, 0, `${kinds.length === 2 ? "G, H" : letter} / kJ mol⁻¹`, 2, 12);
  canvas.append("line").attr("class", "zero").attr("x1", 48).attr("x2", width - 4).attr("y1", y(0)).attr("y2", y(0));
  for (const q of kinds) {
    canvas.append("g").selectAll("path").data(links.filter((l) => !absent(l.from.s[q][k]) && !absent(l.to.s[q][k]))).join("path")
      .attr("class", q === main ? "link" : "link h").attr("stroke", ink)
      .attr("d", (l) => `M${x(l.from) + LEVEL / 2},${y(l.from.s[q][k])}L${x(l.to) - LEVEL / 2},${y(l.to.s[q][k])}`);
  }
  const groups = canvas.append("g").selectAll("g").data(nodes.filter((n) => !absent(n.s[main][k]))).join("g")
    .attr("class", "node").attr("tabindex", 0).attr("role", "img")
    .attr("data-node", (n) => n.key).attr("aria-label", (n) => told(n.s, k));
  groups.append("title").text((n) => told(n.s, k));
  if (kinds.length === 2) {
    const both = groups.filter((n) => !absent(n.s.enthalpy_kj_mol[k]));
    both.append("line").attr("class", "gap").attr("stroke", ink).attr("x1", x).attr("x2", x)
      .attr("y1", (n) => y(n.s.enthalpy_kj_mol[k])).attr("y2", (n) => y(n.s.gibbs_kj_mol[k]));
    levels(both, "level h", (n) => y(n.s.enthalpy_kj_mol[k])).attr("data-enthalpy", (n) => n.s.enthalpy_kj_mol[k]);
  }
  levels(groups, "level", (n) => y(n.s[main][k])).attr("data-value", (n) => n.s[main][k]).attr("data-state", (n) => n.s.state);
  function levels(on, name, at) {
    return on.append("line").attr("class", name).attr("stroke", ink).attr("x1", (n) => x(n) - LEVEL / 2)
      .attr("x2", (n) => x(n) + LEVEL / 2).attr("y1", at).attr("y2", at);
  }
  if (labelled) labels();
  function labels() {
    const grounds = canvas.append("g");
    const letters = Math.max(6, Math.floor((step - LEVEL - 10) / 6.9));
    for (const [, list] of d3.group(nodes, (n) => n.slot)) {
      const found = [];
      for (const n of list.filter((one) => !absent(one.s[main][k]))) {
        const rows = [...lines(n.s.state, letters), `${letter} ${fixed(n.s[main][k], 1)}`], h = n.s.enthalpy_kj_mol[k];
        found.push({ n, rows, at: y(n.s[main][k]), height: 14 * rows.length + 3, y: y(n.s[main][k]) });
        if (kinds.length === 2 && !absent(h)) found.push({ n, rows: [`H ${fixed(h, 1)}`], h: true, at: y(h), height: 17, y: y(h) });
      }
      const kept = found.filter((one) => !one.h || Math.abs(one.at - y(one.n.s[main][k])) >= 1); // at the start H and G are both 0
      apart(kept, 14, height - 2);
      for (const one of kept) {
        const block = canvas.append("g").attr("class", "label").attr("aria-hidden", "true"), end = x(one.n) + LEVEL / 2;
        block.append("path").attr("class", "leader").attr("fill", "none").attr("d", `M${end + 1},${one.at}L${end + 6},${one.y}`);
        one.rows.forEach((text, row) => block.append("text").attr("x", end + 8)
          .attr("class", one.h ? "halo soft" : row === one.rows.length - 1 ? "halo value" : "halo")
          .attr("y", one.y - one.height / 2 + 12 + 14 * row).text(text).call(fit, step - LEVEL - 10));
        const size = block.node().getBBox(); // a ground that lines do not run through
        grounds.append("rect").attr("class", "ground").attr("x", end + 6).attr("y", size.y)
          .attr("width", Math.max(0, size.x + size.width - end - 4)).attr("height", size.height);
      }
    }
  }
  const say = (_, n) => {
    chart.said.text(told(n.s, k));
    d3.selectAll("tr.on").classed("on", false);
    d3.selectAll("tr[data-key]").filter(function () { return this.dataset.key === `${n.s.path}|${n.s.state}`; }).classed("on", true);
  };
  groups.on("mouseenter", say).on("focus", say);
  if (focused !== null) groups.filter((n) => n.key === focused).each(function () { this.focus({ preventScroll: true }); });
  swatches(legend, drawn.length <= 12 && drawn.length > 1
    ? [...drawn.map((p) => [colour(paths.indexOf(p)), p]), ...(nodes.some((n) => n.paths.length > 1) ? [["var(--ink)", "several paths"]] : [])] : []);
}

const told = (s, k) => `${printable(s.state)} (${s.kind === "saddle" ? "saddle point" : s.kind}): H ${energy(s.enthalpy_kj_mol[k])}, ` +
  `G ${energy(s.gibbs_kj_mol[k])} kJ/mol, S ${entropy(s.entropy_j_mol_k[k])} J/(mol K)`;

// A name in lines of at most so many letters, broken at its plus signs.
function lines(name, letters) {
  const found = [];
  for (const part of printable(name).split(/(?<= \+) /)) {
    const last = found.length - 1;
    if (last >= 0 && `${found[last]} ${part}`.length <= letters) found[last] += ` ${part}`;
    else found.push(part);
  }
  if (found.length > 3) found.splice(2, found.length - 2, "…");
  return found.map((one) => brief(one, letters));
}
