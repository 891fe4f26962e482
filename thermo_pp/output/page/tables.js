// Tables: headings that sort, pages where they are long, a field to search in.
const ROWS = 40;

// A heading breaks before its unit only.
const heading = (name) => name.length < 10 ? name.replace(/ /g, "\u00a0")
  : name.replace(/ \/ (.*)$/, (_, of) => ` / ${of.replace(/ /g, "\u00a0")}`);

// A column is {name, get(row), show(value), number, long, head}; show is printable() unless given.
function table(parent, { caption, columns, note, mark }) {
  const box = parent.append("div").attr("class", "table");
  const tools = box.append("div").attr("class", "pages").attr("hidden", "");
  const search = tools.append("input").attr("type", "search").attr("placeholder", "Search in the table")
    .attr("aria-label", `Search in: ${printable(caption)}`);
  const scroll = box.append("div").attr("class", "scroll").attr("tabindex", 0)
    .attr("role", "region").attr("aria-label", printable(caption));
  const inner = scroll.append("table");
  const title = inner.append("caption").append("span").text(printable(caption));
  const heads = inner.append("thead").append("tr").selectAll("th").data(columns).join("th")
    .attr("scope", "col").attr("aria-sort", "none").classed("number", (c) => c.number);
  heads.append("button").attr("type", "button").text((c) => heading(c.name));
  const body = inner.append("tbody");
  const pages = box.append("div").attr("class", "pages").attr("hidden", "");
  const back = pages.append("button").attr("type", "button").text("Earlier rows");
  const on = pages.append("button").attr("type", "button").text("Later rows");
  const where = pages.append("span").attr("role", "status");
  if (note) box.append("p").attr("class", "note").text(note);
  let rows = [], first = 0, sorted = null, falling = false, wanted = "";

  function order() {
    const found = wanted === "" ? [...rows] : rows.filter((row) =>
      columns.some((c) => cell(c, row).toLowerCase().includes(wanted)));
    if (sorted === null) return found;
    const sign = falling ? -1 : 1;
    return found.sort((one, other) => {
      const a = sorted.get(one), b = sorted.get(other);
      if (absent(a) || absent(b)) return absent(a) - absent(b);
      return sign * (typeof a === "number" && typeof b === "number" ? a - b
        : String(a).localeCompare(String(b), "en", { numeric: true }));
    });
  }
  const cell = (c, row) => absent(c.get(row)) ? NONE : (c.show ?? printable)(c.get(row));
  function draw() {
    const found = order();
    first = Math.max(0, Math.min(first, Math.floor((found.length - 1) / ROWS) * ROWS));
    const lines = body.selectAll("tr").data(found.slice(first, first + ROWS)).join("tr")
      .attr("data-key", (row) => mark ? mark(row) : null);
    lines.selectAll("th,td").data((row) => columns.map((c) => [c, row]))
      .join((enter) => enter.append(([c]) => document.createElement(c.head ? "th" : "td")))
      .attr("scope", ([c]) => c.head ? "row" : null)
      .classed("number", ([c]) => c.number).classed("long", ([c]) => c.long)
      .classed("words", ([c]) => !c.number)
      .attr("title", ([c, row]) => c.number && !absent(c.get(row)) ? String(c.get(row)) : null)
      .attr("data-value", ([c, row]) => c.number && !absent(c.get(row)) ? JSON.stringify(c.get(row)) : null)
      .text(([c, row]) => cell(c, row));
    tools.attr("hidden", rows.length > ROWS ? null : "");
    pages.attr("hidden", rows.length > ROWS ? null : "");
    back.property("disabled", first === 0);
    on.property("disabled", first + ROWS >= found.length);
    where.text(found.length === 0 ? "no row has it"
      : `rows ${first + 1} to ${Math.min(first + ROWS, found.length)} of ${found.length}`);
    heads.attr("aria-sort", (c) => c !== sorted ? "none" : falling ? "descending" : "ascending");
  }
  heads.selectAll("button").on("click", (_, c) => {
    falling = sorted === c && !falling;
    sorted = c;
    first = 0;
    draw();
  });
  search.on("input", (event) => { wanted = event.target.value.toLowerCase(); first = 0; draw(); });
  back.on("click", () => { first -= ROWS; draw(); });
  on.on("click", () => { first += ROWS; draw(); });
  return (next, newCaption) => {
    rows = next;
    if (newCaption) {
      title.text(printable(newCaption));
      scroll.attr("aria-label", printable(newCaption));
    }
    draw();
  };
}

// A long text that opens; returns its paragraph.
function inWords(parent, words) {
  const box = parent.append("details");
  box.append("summary").text("In words");
  return box.append("p").text(printable(words));
}

// A list of choices with its label; returns the select.
function pick(parent, label, options, chosen, changed) {
  const box = parent.append("label").attr("class", "pick");
  box.append("span").text(label);
  const select = box.append("select");
  select.selectAll("option").data(options).join("option")
    .attr("value", ([value]) => value).property("selected", ([value]) => value === chosen)
    .text(([, text]) => brief(text, 60));
  select.on("change", (event) => changed(event.target.value));
  return select;
}
