"use strict";
// What the parts of the page share: the study's columns, how numbers are written, the pictures' common looks.
const study = JSON.parse(document.getElementById("study").textContent);
const count = study.number.length;
const INK = "#000000", BLUE = "#0072B2", RED = "#D55E00", QUIET = "#555555", PALE = "#b5b5b5", RULE = "#dddddd";
const placeOf = new Map(study.number.map((number, place) => [number, place]));

// Four significant digits; whole numbers below ten million without a power of ten: as the tables of a run.
function digits(value) {
  if (value === 0) return "0";
  const rounded = halfToEven(value);
  const [front, power] = rounded.toExponential(3).split("e");
  if (Number(power) < -4 || Math.abs(value) >= 1e7 && Number(power) >= 4) return tidy(`${front}e${power}`);
  return String(rounded);
}

// A value half-way between two of four digits goes to the even one.
function halfToEven(value) {
  const [front, power] = value.toExponential(60).split("e");
  const [, head, last, rest] = front.match(/^(-?\d\.\d\d)(\d)(\d*)$/);
  if (!/^50*$/.test(rest) || Number(last) % 2) return Number(value.toPrecision(4));
  return Number(`${head}${last}e${power}`);
}

function tidy(text) {
  const [front, power] = text.split("e");
  const size = Math.abs(Number(power));
  const short = front.includes(".") ? front.replace(/\.?0+$/, "") : front;
  return `${short}e${Number(power) < 0 ? "-" : "+"}${size < 10 ? "0" : ""}${size}`;
}

const written = (value, unit) => value === null || value === undefined ? "-" : (digits(value) + " " + (unit || "")).trimEnd();
const marked = (word) => (study.marks[word] ? study.marks[word] + " " : "") + word;
// The drawing library reads a few tags in its texts; names of a spec are no tags.
const plain = (text) => String(text).replace(/&/g, "&amp;").replace(/</g, "&lt;").replace(/>/g, "&gt;");
const short = (text, most) => text.length > most ? text.slice(0, most - 1) + "…" : text;
const withUnit = (words, unit) => unit ? `${words} (${unit})` : words;

function element(name, attributes, ...children) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes || {})) made.setAttribute(key, value);
  made.append(...children);
  return made;
}

function axisText(axis, place) {
  const value = axis.values[place];
  if (value === null) return "-";
  return axis.numeric ? written(value, axis.unit) : axis.levels[value];
}

const wordOf = (place) => study.words[study.word[place]];
const isFinished = (place) => study.verdict[place] >= 0;
const verdictOf = (place) => isFinished(place) ? study.verdicts[study.verdict[place]] : "";

// The limit of which least is left, or that is missed by most.
function governing(place) {
  let found = null;
  for (const limit of study.limits) {
    const left = limit.left[place];
    if (left !== null && (found === null || left < found.left[place])) found = limit;
  }
  return found;
}

const givenOf = (limit, place) => Array.isArray(limit.given) ? limit.given[place] : limit.given;

// All that can be put on an axis: key, words, unit, values, which way is better (0: neither).
const choices = [];
if (study.aim.words) choices.push({key: "aim", words: "aim: " + short(study.aim.words, 60), unit: study.aim.unit, values: study.aim.values, better: study.aim.most ? 1 : -1});
for (const figure of study.figures) {
  const aimed = figure.name === study.aim.figure;
  const better = aimed ? (study.aim.most ? 1 : -1) : figure.better === "larger" ? 1 : -1;
  choices.push({key: figure.name, words: figure.words, unit: figure.unit, values: figure.solid, better, sized: !aimed && better < 0});
}
for (const limit of study.limits) {
  choices.push({key: "left:" + limit.name, words: "left of limit " + limit.name, unit: "%", values: limit.left, better: 1});
}
for (const axis of study.axes) {
  choices.push({key: "axis:" + axis.name, words: axis.name, unit: axis.unit, values: axis.values, better: 0, levels: axis.levels});
}

function summaryOf(place) {
  const lines = [`<b>variant ${study.number[place]}</b>`];
  for (const axis of study.axes) lines.push(plain(short(axis.name, 40)) + " " + plain(short(axisText(axis, place), 40)));
  lines.push("");
  if (study.aim.words) lines.push("aim " + written(study.aim.values[place], study.aim.unit));
  for (const figure of study.figures.slice(0, 8)) {
    lines.push(plain(figure.words) + " " + plain(written(figure.solid[place], figure.unit)));
  }
  const limit = governing(place);
  if (limit) {
    const left = limit.left[place];
    lines.push(`${plain(limit.name)}: ${left < 0 ? `missed by ${digits(-left)} %` : `${digits(left)} % left`}`);
  }
  if (verdictOf(place)) lines.push("limits " + plain(marked(verdictOf(place))));
  lines.push(plain(marked(wordOf(place))));
  return lines.join("<br>");
}

function layout(width, height, more) {
  return Object.assign({
    width, height, autosize: false, paper_bgcolor: "#ffffff", plot_bgcolor: "#ffffff", hovermode: "closest",
    font: {family: '"DejaVu Sans", Verdana, sans-serif', size: 12.5, color: INK},
    margin: {l: 74, r: 20, t: 20, b: 56}, showlegend: false,
    hoverlabel: {bgcolor: "#ffffff", bordercolor: QUIET, font: {color: INK}, align: "left"},
  }, more);
}

function ruled(more) {
  return Object.assign({showline: true, linecolor: INK, ticks: "outside", tickcolor: INK, ticklen: 4, gridcolor: RULE,
    zeroline: false, automargin: true}, more);
}

const settings = {displaylogo: false, modeBarButtonsToRemove: ["select2d", "lasso2d", "autoScale2d"], responsive: false};
const pageWidth = () => Math.max(700, Math.min(1196, document.body.clientWidth - 64));
const ticksOf = (choice) => choice.levels ? {tickvals: choice.levels.map((_, i) => i), ticktext: choice.levels.map((t) => plain(short(t, 24)))} : {};
