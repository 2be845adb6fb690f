// Every variant as a line over upright axes: its varied values, then its figures.
const MOST_LINES = 150;

function spread(places, most) {
  if (places.length <= most) return places;
  return Array.from({length: most}, (_, i) => places[Math.floor(i * places.length / most)]);
}

function uprights() {
  const named = study.axes.map((axis) => "axis:" + axis.name);
  const figures = [study.first, study.second, ...study.figures.map((figure) => figure.name)].filter((key) => !key.startsWith("axis:"));
  const keys = [...named.slice(0, 8), ...[...new Set(figures)].slice(0, 6)];
  return keys.map((key) => choices.find((choice) => choice.key === key)).filter(Boolean).map((choice) => {
    const known = choice.values.filter((value, place) => value !== null && isFinished(place));
    let [least, most] = known.reduce(([low, high], value) => [Math.min(low, value), Math.max(high, value)], [Infinity, -Infinity]);
    if (!known.length) [least, most] = [0, 1];
    const at = (value) => value === null ? null : most > least ? (value - least) / (most - least) : 0.5;
    return {choice, least, most, at};
  });
}

// At most three lines of about so many letters, broken after dots, underscores and blanks.
function wrapped(text, most) {
  const lines = [""];
  for (const piece of text.split(/(?<=[._ @])/)) {
    if (lines[lines.length - 1] && (lines[lines.length - 1] + piece).length > most) lines.push("");
    lines[lines.length - 1] += piece;
  }
  return (lines.length > 3 ? ["…", ...lines.slice(-2)] : lines).map((line) => plain(short(line, most + 4))).join("<br>");
}

function polyline(axes, places) {
  const x = [], y = [], who = [];
  for (const place of places) {
    axes.forEach((axis, i) => { x.push(i); y.push(axis.at(axis.choice.values[place])); who.push(place); });
    x.push(null); y.push(null); who.push(null);
  }
  return {x, y, customdata: who};
}

function drawParallel() {
  const axes = uprights();
  const good = study.ranking.filter((place) => wordOf(place) !== "suspicious");
  const doubtful = pick((place) => wordOf(place) === "suspicious");
  const other = study.misses.filter((place) => wordOf(place) !== "suspicious");
  const sets = [
    [other, "limits not met", {color: "#c8c8c8", width: 1}],
    [doubtful, "! suspicious", {color: RED, width: 1.2, dash: "dot"}],
    [good, study.limits.length ? "every limit met" : "finished", {color: BLUE, width: 1}],
  ].filter((set) => set[0].length);
  const traces = sets.map(([places, name, line]) => Object.assign({type: "scatter", mode: "lines+markers", line, marker: {size: 5, color: line.color},
    hoverinfo: "none", connectgaps: false, name: `${plain(name)} (${places.length})`}, polyline(axes, spread(places, MOST_LINES))));
  const mark = study.top >= 0 ? [study.top] : [];
  traces.push(Object.assign({type: "scatter", mode: "lines+markers", line: {color: INK, width: 3}, marker: {size: 9, color: INK}, hoverinfo: "none",
    showlegend: mark.length > 0, name: mark.length ? `variant ${study.number[mark[0]]}, at the top of this page` : ""}, polyline(axes, mark)));
  traces.push({type: "scatter", mode: "lines+markers", x: [], y: [], line: {color: INK, width: 2.5, dash: "dash"}, marker: {size: 8, color: INK}, hoverinfo: "skip", showlegend: false});
  const label = (axis, value) => axis.choice.levels ? short(axis.choice.levels[value] ?? "-", 18) : digits(value);
  Plotly.newPlot("lines-plot", traces, layout(pageWidth(), 500, {
    showlegend: true, legend: {orientation: "h", x: 0, y: -0.1, font: {size: 11.5}}, margin: {l: 60, r: 60, t: 80, b: 60},
    xaxis: {visible: false, range: [-0.35, axes.length - 0.65], fixedrange: true}, yaxis: {visible: false, range: [-0.08, 1.08], fixedrange: true},
    shapes: axes.map((_, i) => ({type: "line", x0: i, x1: i, y0: 0, y1: 1, line: {color: INK, width: 1}, layer: "below"})),
    annotations: axes.flatMap((axis, i) => [
      {x: i, yref: "paper", y: 1.04, text: wrapped(axis.choice.words, axes.length > 8 ? 10 : 22) + "<br>" + (plain(axis.choice.unit) || " "), showarrow: false, font: {size: 11.5}, yanchor: "bottom"},
      {x: i, yref: "y", y: 1.02, text: plain(label(axis, axis.most)), showarrow: false, font: {size: 11, color: QUIET}, yanchor: "bottom"},
      {x: i, y: -0.02, text: plain(label(axis, axis.least)), showarrow: false, font: {size: 11, color: QUIET}, yanchor: "top"}]),
  }), Object.assign({}, settings, {displayModeBar: false})).then((plot) => follow(plot, axes));
  tellParallel(sets);
}

// The line under the pointer is drawn over all others, and its variant told.
function follow(plot, axes) {
  const note = document.getElementById("lines-note");
  const last = plot.data.length - 1, rest = note.textContent;
  plot.on("plotly_hover", (event) => {
    const place = event.points[0].customdata;
    if (place === null || place === undefined) return;
    const line = polyline(axes, [place]);
    Plotly.restyle(plot, {x: [line.x], y: [line.y]}, [last]);
    note.textContent = `Variant ${study.number[place]}: ` + axes.map((axis) => `${axis.choice.words} ${axis.choice.levels ? axis.choice.levels[axis.choice.values[place]] : written(axis.choice.values[place], axis.choice.unit)}`).join(", ") + `; ${marked(wordOf(place))}.`;
  });
  plot.on("plotly_unhover", () => { Plotly.restyle(plot, {x: [[]], y: [[]]}, [last]); note.textContent = rest; });
  plot.on("plotly_click", (event) => {
    const place = event.points[0].customdata;
    if (place !== null && place !== undefined) showVariant(study.number[place], true);
  });
}

function tellParallel(sets) {
  const thinned = sets.some((set) => set[0].length > MOST_LINES);
  document.getElementById("lines-note").textContent = "Each line is one variant; each upright goes from the least value below to the largest above. " +
    (thinned ? `Of each kind at most ${MOST_LINES} are drawn, evenly taken in the order of the ranking. ` : "") + "Point at a line to follow it.";
}
