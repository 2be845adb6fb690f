// Two figures against each other: judgement by shape and word, limits by filling, the best front by a line.
const SHAPES = {agrees: "circle", explained: "square", suspicious: "triangle-up"};

function markerOf(word, verdict) {
  const good = verdict === "met" || verdict === "";
  const size = count > 2000 ? 5 : count > 400 ? 7 : 10;  // so that they can be told apart
  if (good) return {symbol: SHAPES[word], size, color: word === "suspicious" ? "#fbe3d3" : "#a9cfe6", line: {width: size > 5 ? 1.6 : 0.7, color: word === "suspicious" ? RED : BLUE}};
  return {symbol: SHAPES[word] + "-open" + (verdict === "not established" ? "-dot" : ""), size: 0.8 * size, color: word === "suspicious" ? "#e59a66" : "#8a8a8a", line: {width: size > 5 ? 1.1 : 0.6}};
}

// Not suspicious, and every limit met but those on the two figures drawn, which stand in the picture as lines.
function mayLead(place, across, up) {
  if (!isFinished(place) || wordOf(place) === "suspicious") return false;
  return study.limits.every((limit) => limit.verdict[place] === 0 || limit.figure === across.key || limit.figure === up.key
    || "left:" + limit.name === across.key || "left:" + limit.name === up.key);
}

// Places that no other beats in both, along the front.
function bestFront(across, up) {
  if (!across.better || !up.better || across.key === up.key) return [];
  const places = pick((place) => mayLead(place, across, up) && across.values[place] !== null && up.values[place] !== null);
  const x = (place) => -across.better * sized(across, place), y = (place) => -up.better * sized(up, place);
  places.sort((a, b) => x(a) - x(b) || y(a) - y(b) || a - b);
  const front = [];
  for (const place of places) if (!front.length || y(place) < y(front[front.length - 1])) front.push(place);
  return front;
}

// Of displacements and the like the size counts, whatever the sign.
const sized = (choice, place) => choice.sized ? Math.abs(choice.values[place]) : choice.values[place];

function limitLines(choice, along) {
  return study.limits.filter((limit) => limit.figure === choice.key && !Array.isArray(limit.given)).map((limit) => ({
    value: limit.given, words: `${plain(short(limit.name, 30))}: ${limit.most ? "at most" : "at least"} ${written(limit.given, limit.unit)}`, along,
  }));
}

function drawTradeoff() {
  const across = choices.find((choice) => choice.key === document.getElementById("across").value);
  const up = choices.find((choice) => choice.key === document.getElementById("up").value);
  const traces = [], front = bestFront(across, up);
  const known = (place) => isFinished(place) && across.values[place] !== null && up.values[place] !== null;
  for (const verdict of ["missed", "not established", "", "met"]) for (const word of Object.keys(SHAPES)) {
    const places = pick((place) => known(place) && wordOf(place) === word && verdictOf(place) === verdict);
    if (!places.length) continue;
    traces.push({type: "scatter", mode: "markers", x: places.map((p) => across.values[p]), y: places.map((p) => up.values[p]),
      customdata: places, text: places.map(summaryOf), hoverinfo: "text", marker: markerOf(word, verdict),
      name: `${plain(marked(word))}${verdict ? ", limits " + verdict : ""} (${places.length})`});
  }
  if (front.length > 1) traces.push({type: "scatter", mode: "lines", x: front.map((p) => across.values[p]), y: front.map((p) => up.values[p]),
    line: {color: INK, width: 2}, hoverinfo: "skip", name: "best front"});
  if (study.top >= 0 && known(study.top)) traces.push({type: "scatter", mode: "markers", x: [across.values[study.top]], y: [up.values[study.top]],
    customdata: [study.top], text: [summaryOf(study.top)], hoverinfo: "text", marker: {symbol: "circle-open", size: 22, color: INK, line: {width: 2}}, name: `variant ${study.number[study.top]}, at the top of this page`});
  const lines = [...limitLines(across, "x"), ...limitLines(up, "y")];
  Plotly.react("tradeoff-plot", traces, layout(pageWidth(), 560, {
    showlegend: true, legend: {orientation: "v", x: 1.01, y: 1, xanchor: "left", font: {size: 11.5}},
    margin: {l: 78, r: 330, t: 30, b: 56},
    xaxis: ruled(Object.assign({title: {text: plain(withUnit(across.words, across.unit))}}, ticksOf(across))),
    yaxis: ruled(Object.assign({title: {text: plain(withUnit(up.words, up.unit))}}, ticksOf(up))),
    shapes: lines.map((line) => Object.assign({type: "line", line: {color: QUIET, width: 1.4, dash: "dash"}},
      line.along === "x" ? {x0: line.value, x1: line.value, yref: "paper", y0: 0, y1: 1} : {y0: line.value, y1: line.value, xref: "paper", x0: 0, x1: 1})),
    annotations: lines.map((line) => Object.assign({text: line.words, showarrow: false, font: {color: QUIET, size: 11.5}, bgcolor: "rgba(255,255,255,0.8)"},
      line.along === "x" ? {x: line.value, yref: "paper", y: 1, yanchor: "bottom"} : {y: line.value, xref: "paper", x: 1, xanchor: "right", yanchor: "bottom"})),
  }), settings).then(() => {
    const plot = document.getElementById("tradeoff-plot");
    plot.removeAllListeners("plotly_click");
    plot.on("plotly_click", (event) => {
      const place = event.points[0].customdata;
      if (place !== undefined) showVariant(study.number[place], true);
    });
  });
  tellFront(front, across, up);
}

function tellFront(front, across, up) {
  const note = document.getElementById("tradeoff-note");
  if (!across.better || !up.better) {
    note.textContent = "No front is drawn: of a varied value neither more nor less is better by itself.";
  } else if (front.length < 2) {
    note.textContent = front.length ? `One variant is best in both: variant ${study.number[front[0]]}.` : "No variant without a suspicion meets the other limits: there is no front.";
  } else {
    const shown = front.slice(0, 12).map((place) => study.number[place]).join(", ");
    note.textContent = `The line joins the ${front.length} variants that no other beats in both, of those without a suspicion that meet all limits not drawn here: ${shown}${front.length > 12 ? ", ..." : ""}. ` +
      (study.limits.length ? "Filled: every limit met. Open: one is missed, or (with a dot) not established. " : "") + "Point at a mark for its values, press it for all of the variant.";
  }
}

function startTradeoff() {
  for (const [id, key] of [["across", study.first], ["up", study.second]]) {
    const select = document.getElementById(id);
    for (const choice of choices) select.append(element("option", {value: choice.key}, withUnit(choice.words, choice.unit)));
    select.value = key;
    if (!select.value) select.selectedIndex = 0;
    select.addEventListener("change", drawTradeoff);
  }
  drawTradeoff();
}
