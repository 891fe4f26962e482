// Numbers and texts as people read them. Values come from results.json and are only written out here.
const DATA = JSON.parse(document.getElementById("results").textContent);
const LEFT_AWAY = JSON.parse(document.getElementById("left-away").textContent);
const NONE = "\u2013";
const RAISED = { "-": "⁻", 0: "⁰", 1: "¹", 2: "²", 3: "³", 4: "⁴", 5: "⁵", 6: "⁶", 7: "⁷", 8: "⁸", 9: "⁹" };
const absent = (value) => value === null || value === undefined;
const raised = (text) => [...String(text).replace("+", "")].map((c) => RAISED[c] ?? c).join("");
const minus = (text) => text.replace(/-/g, "\u2212");

function fixed(value, decimals) {
  if (absent(value)) return NONE;
  const shown = value.toFixed(decimals);
  return minus(Number(shown) === 0 ? shown.replace("-", "") : shown);
}
const energy = (value) => fixed(value, 2);
const entropy = (value) => fixed(value, 1);
const share = (value) => fixed(value, 3);

function general(value, digits = 4) {
  if (absent(value)) return NONE;
  if (value === 0) return "0";
  const [front, power] = value.toExponential(digits - 1).split("e");
  if (power >= -3 && power < digits) return minus(value.toPrecision(digits));
  return `${minus(front)} × 10${raised(power)}`;
}
// A mark on an axis: short where that is exact, a power of ten where it is one.
function mark(value) {
  const plain = Number(value.toPrecision(3)), power = Math.log10(value);
  if (plain === 0 || (Math.abs(plain) < 10000 && Math.abs(plain) >= 0.001)) return minus(String(plain));
  return Number.isInteger(power) ? `10${raised(power)}` : general(value, 2);
}
const degree = (value) => minus(String(Number(value.toFixed(2))));
const kelvin = (value) => `${minus(String(Number(value.toPrecision(10))))} K`;
const unit = (text) => text.replace(/\^(-?\d+)/g, (_, power) => raised(power)).replace(/ /g, "\u00a0");

// Control characters (a newline in a title) are written out.
const printable = (text) =>
  absent(text) ? NONE : String(text).replace(/[\p{Cc}\p{Cf}\u2028\u2029]/gu, (c) =>
    ({ "\n": "\\n", "\t": "\\t", "\r": "\\r" })[c] ?? `\\u${c.codePointAt(0).toString(16).padStart(4, "0")}`);
function brief(text, length) {
  const letters = [...printable(text)];
  return letters.length <= length ? letters.join("") : `${letters.slice(0, Math.max(1, length - 1)).join("")}…`;
}
const place = (one) => absent(one.file) ? NONE : absent(one.line) ? one.file : `${one.file}:${one.line}`;
const colour = (number) => `var(--p${number % 7})`;
