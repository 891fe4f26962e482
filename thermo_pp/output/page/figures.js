// What all figures share: the frame, axes, and labels that keep their distance.
function figure(parent, { title, about, caption, readout, focusable }) {
  const box = parent.append("figure");
  const scroll = box.append("div").attr("class", "scroll").attr("tabindex", 0).attr("role", "region").attr("aria-label", title);
  const svg = scroll.append("svg").attr("role", focusable ? "group" : "img");
  const id = `figure-${document.querySelectorAll("figure").length}`;
  svg.attr("aria-labelledby", `${id}-title ${id}-desc`);
  svg.append("title").attr("id", `${id}-title`).text(title);
  const desc = svg.append("desc").attr("id", `${id}-desc`).text(about);
  const said = readout ? box.append("output").attr("class", "readout note").attr("aria-live", "polite") : null;
  if (readout) said.text(readout);
  const below = box.append("figcaption").text(caption ?? "");
  const canvas = svg.append("g");
  const width = () => Math.max(280, scroll.node().clientWidth);
  const onWidth = (draw) => {
    let known = width();
    new ResizeObserver(() => {
      if (width() === known) return;
      known = width();
      draw();
    }).observe(box.node());
  };
  const size = (w, h) => svg.attr("width", w).attr("height", h).attr("viewBox", `0 0 ${w} ${h}`);
  return { box, svg, canvas, desc, said, below, width, size, onWidth };
}

// Moves labels apart: each {y, height}, kept in order and between top and bottom.
function apart(labels, top, bottom) {
  labels.sort((a, b) => a.y - b.y);
  labels.forEach((one, k) => {
    const above = labels[k - 1];
    const least = above ? above.y + (above.height + one.height) / 2 : top + one.height / 2;
    one.y = Math.max(one.y, least);
  });
  for (let k = labels.length - 1; k >= 0; k--) {
    const below = labels[k + 1];
    const most = below ? below.y - (below.height + labels[k].height) / 2 : bottom - labels[k].height / 2;
    labels[k].y = Math.min(labels[k].y, most);
  }
}

// Shortens texts that are wider than their place; the whole name is in the table.
function fit(texts, width) {
  texts.each(function () {
    let letters = [...this.textContent];
    while (letters.length > 2 && this.getComputedTextLength() > width) {
      letters = letters.slice(0, Math.min(letters.length - 2, Math.floor(letters.length * width / this.getComputedTextLength())));
      this.textContent = `${letters.join("")}…`;
      letters.push("…");
    }
  });
}

function axis(canvas, make, x, y, label, labelX, labelY, anchor = "start") {
  canvas.append("g").attr("class", "axis").attr("transform", `translate(${x},${y})`).call(make);
  canvas.append("text").attr("class", "soft").attr("x", labelX).attr("y", labelY)
    .attr("text-anchor", anchor).text(label);
}

// Temperatures on a reciprocal scale, hot to the left as in Arrhenius' plot.
function reciprocal(range) {
  const [low, high] = d3.extent(DATA.temperature_k);
  const across = d3.scaleLinear([1 / high, 1 / low], range);
  const at = (t) => across(1 / t);
  at.ticks = (count) => low === high ? [low] : d3.ticks(low, high, count);
  return at;
}

function temperatureAxis(canvas, at, y, width, x0, x1) {
  const group = canvas.append("g").attr("class", "axis");
  group.append("path").attr("d", `M${x0},${y}H${x1}`);
  const ticks = at.ticks(Math.max(2, Math.min(8, Math.floor(width / 90))));
  let last = Infinity;
  for (const t of ticks) {
    group.append("path").attr("d", `M${at(t)},${y}v5`);
    if (last - at(t) < 30) continue;
    group.append("text").attr("x", at(t)).attr("y", y + 17).attr("text-anchor", "middle").text(minus(String(t)));
    last = at(t);
  }
  canvas.append("text").attr("class", "soft").attr("x", x1).attr("y", y + 34).attr("text-anchor", "end")
    .text("T / K, on a reciprocal scale");
}

const padded = ([low, high], by = 0.06) => {
  const room = (high - low) * by || Math.abs(high) * by || 1;
  return [low - room, high + room];
};
const numbers = (values) => values.flat(Infinity).filter((v) => typeof v === "number");
const line = (xs, ys, x, y) => d3.line().defined((k) => !absent(ys[k]) && Number.isFinite(y(ys[k])))
  .x((k) => x(xs[k])).y((k) => y(ys[k]))(d3.range(xs.length).sort((a, b) => xs[a] - xs[b]));
function swatches(list, items) {
  const entries = list.selectAll("li").data(items).join("li");
  entries.selectAll("*").remove();
  entries.append("svg").attr("width", 22).attr("height", 12).attr("aria-hidden", "true")
    .append("rect").attr("width", 22).attr("height", 12).attr("fill", ([fill]) => fill);
  entries.append("span").text(([, text]) => printable(text));
}
