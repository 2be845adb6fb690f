// Means of each figure along each varied value, side by side on one scale.
const ACROSS = 4;  // pictures in a row

const HARDLY = 0.02;  // share below which a value is not drawn
const sizeOf = (each) => each.share ?? Math.abs(each.rank ?? 0);

function drawEffects(plot) {
  const found = study.effects[Number(plot.dataset.place)];
  const words = plot.dataset.words, unit = plot.dataset.unit;
  const key = words === "aim" ? "aim" : study.figures[Number(plot.dataset.place) - (study.aim.words ? 1 : 0)].name;
  const values = choices.find((choice) => choice.key === key).values;
  if (!found.each.length || !values.some((value) => value !== null)) return;
  const order = found.each.map((_, i) => i).sort((a, b) => sizeOf(found.each[b]) - sizeOf(found.each[a]) || a - b)
    .filter((i, at) => at === 0 || sizeOf(found.each[i]) >= HARDLY).slice(0, 2 * ACROSS);
  const wide = Math.min(ACROSS, order.length), high = Math.ceil(order.length / ACROSS);
  const traces = [], more = {grid: {rows: high, columns: wide, pattern: "independent", xgap: 0.14, ygap: high > 1 ? 0.42 : 0.2}};
  const scale = found.factor;  // effects come in base units
  const all = order.map((i) => found.each[i]).flatMap((each) => [...each.low, ...each.high]).map((value) => value * scale);
  const [least, most] = [Math.min(...all), Math.max(...all)];
  const pad = 0.08 * (most - least) || 0.05 * Math.abs(most) || 1;
  order.forEach((place, i) => {
    const each = found.each[place], axis = study.axes[place], ending = i ? String(i + 1) : "";
    const factor = axis.numeric ? axis.factor : 1;
    const at = each.at.map((value) => value * factor);
    const mean = each.mean.map((value) => value * scale);
    const text = at.map((value, k) => `${plain(axis.name)} ${plain(axis.numeric ? written(value, axis.unit) : axis.levels[Math.round(value)])}<br>mean ${plain(written(mean[k], unit))}<br>from ${plain(written(each.low[k] * scale, unit))} to ${plain(written(each.high[k] * scale, unit))}`);
    const bars = {x: [], y: []};
    at.forEach((value, k) => { bars.x.push(value, value, null); bars.y.push(each.low[k] * scale, each.high[k] * scale, null); });
    const panel = {xaxis: "x" + ending, yaxis: "y" + ending, type: "scatter"};
    traces.push(Object.assign({mode: "lines", x: bars.x, y: bars.y, line: {color: "#c4c4c4", width: 5}, hoverinfo: "skip"}, panel));
    traces.push(Object.assign({mode: axis.numeric ? "lines+markers" : "markers", x: at, y: mean, text, hoverinfo: "text", line: {color: INK, width: 1.4},
      marker: {symbol: "circle", size: 8, color: "#ffffff", line: {color: BLUE, width: 1.8}}}, panel));
    more["xaxis" + ending] = ruled(Object.assign({title: {text: plain(withUnit(short(axis.name, 34), axis.unit)), standoff: 6}, automargin: false, nticks: 6}, axis.numeric ? (at.length <= 6 ? {tickvals: at, ticktext: at.map(digits)} : {}) : ticksOf(axis), axis.numeric ? {} : {range: [-0.5, axis.levels.length - 0.5]}));
    more["yaxis" + ending] = ruled({range: [least - pad, most + pad], automargin: false, nticks: 6, showticklabels: i % ACROSS === 0, title: i % ACROSS === 0 ? {text: plain(withUnit(short(words, 30), unit)), standoff: 8} : undefined});
  });
  const width = Math.min(pageWidth(), 110 + 272 * wide);
  Plotly.newPlot(plot, traces, layout(width, 60 + 200 * high, Object.assign(more, {margin: {l: 84, r: 16, t: 12, b: 52}})), Object.assign({}, settings, {displayModeBar: false}));
}

// Drawn when they come near the window, or all when the page is printed.
function startEffects() {
  const waiting = new Set(document.querySelectorAll(".effect-plot"));
  const draw = (plot) => { if (waiting.delete(plot)) drawEffects(plot); };
  const watch = new IntersectionObserver((seen) => {
    for (const one of seen) if (one.isIntersecting) { watch.unobserve(one.target); draw(one.target); }
  }, {rootMargin: "800px"});
  waiting.forEach((plot) => watch.observe(plot));
  window.addEventListener("beforeprint", () => [...waiting].forEach(draw));
}
