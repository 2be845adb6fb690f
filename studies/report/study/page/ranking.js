// The ranking: which variants are listed, sorting by any column, one sheet at a time.
const ranking = {list: [], sheet: 0, key: null, down: false};

const groups = [
  ["meet", "those that meet every limit", study.ranking],
  ["miss", "those that do not, the nearest first", study.misses],
  ["all", "all that finished", study.ranking.concat(study.misses)],
  ["suspicious", "suspicious ones", pick((place) => wordOf(place) === "suspicious")],
  ["failed", "failed ones", pick((place) => wordOf(place) === "failed")],
  ["waiting", "not run yet", pick((place) => wordOf(place) === "not run yet")],
].filter((group) => group[2].length > 0);
if (!study.limits.length && groups.length) groups[0][1] = "all that finished (no limits were set)";

function pick(holds) {
  const found = [];
  for (let place = 0; place < count; place++) if (holds(place)) found.push(place);
  return found;
}

// What a column holds at a place: a number or a text to sort by, and the text shown.
function cellOf(key, place) {
  const [kind, ...rest] = key.split(":");
  const name = rest.join(":");
  if (kind === "number") return [study.number[place], String(study.number[place])];
  if (kind === "axis") {
    const axis = study.axes.find((one) => one.name === name);
    const value = axis.values[place];
    return [value, value === null ? "-" : axis.numeric ? digits(value) : axis.levels[value]];
  }
  if (kind === "aim") return [study.aim.values[place], written(study.aim.values[place])];
  if (kind === "figure") {
    const value = study.figures.find((one) => one.name === name).solid[place];
    return [value, written(value)];
  }
  const limit = governing(place);
  if (kind === "left") return [limit && limit.left[place], limit ? digits(limit.left[place]) : "-"];
  if (kind === "governs") return [limit && limit.name, limit ? limit.name : "-"];
  if (kind === "verdict") {
    const word = verdictOf(place);
    return [isFinished(place) ? study.verdict[place] : null, word ? marked(word) : isFinished(place) ? "none set" : "-"];
  }
  const word = wordOf(place);
  if (word === "failed") return [study.word[place], `failed: ${study.texts[study.stage[place]]}: ${short(study.texts[study.reason[place]], 90)}`];
  return [study.word[place], marked(word)];
}

function drawSheet() {
  const table = document.getElementById("table");
  const heads = [...table.tHead.rows[0].cells];
  const rows = ranking.list.slice(ranking.sheet * study.rows, (ranking.sheet + 1) * study.rows).map((place) => {
    const row = element("tr", place === study.top ? {class: "chosen"} : {});
    for (const head of heads) {
      const text = cellOf(head.dataset.key, place)[1];
      if (head.dataset.key === "number") row.append(element("td", {}, element("button", {type: "button", class: "look", "data-number": text}, text)));
      else row.append(element("td", head.className ? {class: head.className} : text.length > 24 ? {class: "text"} : {}, text));
    }
    return row;
  });
  table.tBodies[0].replaceChildren(...rows);
  drawPages();
}

function drawPages() {
  const last = Math.max(0, Math.ceil(ranking.list.length / study.rows) - 1);
  const step = (text, by) => {
    const button = element("button", {type: "button", "aria-label": by < 0 ? "sheet before" : "next sheet"}, text);
    button.disabled = by < 0 ? ranking.sheet === 0 : ranking.sheet === last;
    button.addEventListener("click", () => { ranking.sheet += by; drawSheet(); });
    return button;
  };
  const first = ranking.sheet * study.rows;
  const shown = `${first + 1} to ${Math.min(first + study.rows, ranking.list.length)} of ${ranking.list.length}`;
  document.getElementById("pages").replaceChildren(...(last ? [step("←", -1), step("→", 1)] : []), shown);
}

function sortBy(key) {
  ranking.down = ranking.key === key ? !ranking.down : false;
  ranking.key = key;
  const sign = ranking.down ? -1 : 1;
  const values = new Map(ranking.list.map((place) => [place, cellOf(key, place)[0]]));
  ranking.list = [...ranking.list].sort((a, b) => {
    const [x, y] = [values.get(a), values.get(b)];
    if (x === null || x === undefined) return y === null || y === undefined ? a - b : 1;
    if (y === null || y === undefined) return -1;
    return x < y ? -sign : x > y ? sign : a - b;
  });
  ranking.sheet = 0;
  for (const cell of document.getElementById("table").tHead.rows[0].cells) {
    if (cell.dataset.key === key) cell.setAttribute("aria-sort", ranking.down ? "descending" : "ascending");
    else cell.removeAttribute("aria-sort");
  }
  drawSheet();
}

function startRanking() {
  const which = document.getElementById("which");
  for (const [key, words, places] of groups) which.append(element("option", {value: key}, `${words} (${places.length})`));
  const choose = () => {
    ranking.list = groups.find((group) => group[0] === which.value)[2];
    ranking.sheet = 0;
    ranking.key = null;
    for (const cell of document.getElementById("table").tHead.rows[0].cells) cell.removeAttribute("aria-sort");
    drawSheet();
  };
  which.addEventListener("change", choose);
  document.querySelectorAll("#table thead button").forEach((button) => {
    button.addEventListener("click", () => sortBy(button.closest("th").dataset.key));
  });
  choose();
}
