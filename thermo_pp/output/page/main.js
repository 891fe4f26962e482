// The page: what is chosen, and which sections there are.
const own = DATA.treatment.low_modes;
const order = d3.range(DATA.temperature_k.length).sort((a, b) => DATA.temperature_k[a] - DATA.temperature_k[b]);
const HELD = "\u0000held"; // no standard state is called that
const state = {
  k: d3.least(order, (k) => Math.abs(DATA.temperature_k[k] - 298.15)), low: own, standard: DATA.standard_state, definition: null,
  get t() { return DATA.temperature_k[this.k]; },
  profile() {
    if (this.standard === HELD) return DATA.profile_at_conditions;
    return DATA.profiles.find((p) => p.low_modes === this.low && p.standard_state === this.standard) ?? DATA.profiles[0];
  },
  barrier() { return DATA.barriers.find((b) => b.low_modes === this.low) ?? DATA.barriers.find((b) => b.low_modes === own) ?? DATA.barriers[0]; },
  rate() {
    const barrier = this.barrier();
    return barrier ? barrier.rates[this.definition] ?? barrier.rates[definitions(barrier)[0]] ?? null : null;
  },
};
if (DATA.barriers.length) state.definition = definitions(state.barrier())[0] ?? null;
const rated = DATA.barriers.length > 0 && state.definition !== null;

// Key of results.json (or what has to be there), heading, and what draws it; left_out says why one is not there.
const SECTIONS = [
  ["profiles", "Profile", profileSection, DATA.profiles.length > 0],
  ["effective", "Barrier", barrierSection, rated],
  ["control", "Controls", controlSection, rated],
  ["steps", "Steps", stepSection, DATA.barriers.length > 0],
  ["regimes", "Regime map", regimeSection],
  ["doubt", "Doubt", doubtSection],
  ["selectivity", "Selectivity", plainSection("selectivity")],
  ["time_course", "Time courses", courseSection],
  ["flow", "Flow", plainSection("flow")],
  ["isotopes", "Isotope effects", plainSection("isotopes")],
  ["comparison", "Comparison with measurements", comparisonSection],
  ["choices", "Choices", choicesSection],
  ["species", "Species", speciesSection],
  ["conformers", "Conformers", conformerSection],
  ["formation", "Enthalpies of formation", plainSection("formation")],
  ["findings", "Findings", findingSection],
  ["provenance", "Where every number came from", sourceSection],
];

const draws = [];
const redraw = () => { for (const draw of draws) draw(); };

function temperature() {
  const slider = d3.select("#temperature").attr("max", order.length - 1);
  d3.select("#grid").selectAll("option").data(order.length <= 60 ? order : []).join("option")
    .attr("value", (_, n) => n).attr("label", (k) => kelvin(DATA.temperature_k[k]));
  const show = () => {
    d3.select("#kelvin").text(kelvin(state.t));
    slider.attr("aria-valuetext", kelvin(state.t));
  };
  slider.property("value", order.indexOf(state.k)).property("disabled", order.length === 1)
    .on("input", () => { state.k = order[Number(slider.property("value"))]; show(); redraw(); });
  show();
}

function choices() {
  const form = d3.select("#chosen").on("submit", (event) => event.preventDefault());
  const lows = [...new Set([...DATA.profiles, ...DATA.barriers].map((one) => one.low_modes))];
  const states = [...new Set(DATA.profiles.map((p) => p.standard_state))].map((s) => [s, s]);
  if (DATA.profile_at_conditions) states.push([HELD, `at the concentrations held (${own})`]);
  if (lows.length) pick(form, "Soft modes", lows.map((l) => [l, l === own ? `${l} (the study's)` : l]), state.low, (v) => { state.low = v; redraw(); }).attr("id", "low-modes");
  if (states.length) pick(form, "Standard state of the profile", states, state.standard, (v) => { state.standard = v; redraw(); }).attr("id", "standard-state");
  if (rated) pick(form, "Rate", definitions(state.barrier()).map((d) => [d, DEFINITIONS[d]]), state.definition, (v) => { state.definition = v; redraw(); }).attr("id", "definition");
}

function sections() {
  const main = d3.select("#main"), list = d3.select("#sections"), missing = [];
  const link = (id, heading) => list.append("li").append("a").attr("href", `#${id}`).text(heading);
  for (const [key, heading, make, there = !absent(DATA[key])] of SECTIONS) {
    if (!there) {
      missing.push([heading, reasonFor(key)]);
      continue;
    }
    const root = main.append("section").attr("id", key).attr("aria-labelledby", `${key}-heading`);
    root.append("h2").attr("id", `${key}-heading`).text(heading);
    const draw = make(root, state);
    draws.push(draw);
    link(key, heading);
  }
  for (const [part, why] of Object.entries(DATA.left_out)) {
    if (part.includes(" ")) missing.push([part, why]);
  }
  if (!missing.length && !LEFT_AWAY.length) return;
  const root = main.append("section").attr("id", "absent").attr("aria-labelledby", "absent-heading");
  root.append("h2").attr("id", "absent-heading").text("Not on this page");
  const items = root.append("ul");
  items.selectAll("li").data([...missing.map(([what, why]) => `${what}: ${why}`), ...LEFT_AWAY.map((what) => `To keep the page small: ${what}. It is in results.json.`)])
    .join("li").text(printable);
  link("absent", "Not on this page");
}
const NAMES = { conformers: "ensembles", time_course: "transient", control: "effective", steps: "effective" };
const reasonFor = (key) => DATA.left_out[NAMES[key] ?? key] ??
  (LEFT_AWAY.length && key in DATA === false ? "see below" : "the study has none");

d3.select("#about").text([
  DATA.barriers[0]?.net_reaction, DATA.level ? `level ${DATA.level}` : null, ...(DATA.levels ?? []),
  `Soft modes: ${own}, onset ${DATA.treatment.onset_cm} cm⁻¹. Standard state: ${DATA.standard_state}.`,
].filter(Boolean).map(printable).join(" · "));
d3.select("#made").text(`thermo_pp ${DATA.version}; constants: ${DATA.constants}. Every value is that of results.json; point at a number in a table for all its digits. Drawn with D3 (ISC licence, in this file).`);
addEventListener("beforeprint", () => d3.selectAll("details").attr("open", ""));
temperature();
choices();
sections();
redraw();
