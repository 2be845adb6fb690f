// All of one variant, made when it is asked for.
function rowsOf(head, rows) {
  const top = element("tr", {}, ...head.map((text) => element("th", {scope: "col"}, text)));
  const body = rows.map((cells) => element("tr", {}, ...cells.map((text, i) =>
    i ? element("td", i < head.length && /^(solid|beam|difference|found|given|left)$/.test(head[i]) ? {class: "n"} : {}, text)
      : element("th", {scope: "row"}, text))));
  return element("table", {}, element("thead", {}, top), element("tbody", {}, ...body));
}

function figureRows(place) {
  return study.figures.filter((figure) => figure.solid[place] !== null || figure.beam[place] !== null).map((figure) => {
    const [solid, beam] = [figure.solid[place], figure.beam[place]];
    const apart = solid === null || beam === null || solid === 0 ? "-" : digits(100 * (solid - beam) / Math.abs(solid)) + " %";
    return [withUnit(figure.words, figure.unit), written(solid), written(beam), apart, marked(study.words[figure.word[place]])];
  });
}

function limitRows(place) {
  return study.limits.filter((limit) => limit.verdict[place] !== null).map((limit) => {
    const left = limit.left[place];
    const reason = limit.reason[place];
    return [limit.name, limit.words, written(limit.found[place], limit.unit),
      (limit.most ? "at most " : "at least ") + written(givenOf(limit, place), limit.unit),
      left === null ? "-" : left < 0 ? `missed by ${digits(-left)} %` : digits(left) + " %",
      marked(study.verdicts[limit.verdict[place]]), reason >= 0 ? study.texts[reason] : ""];
  });
}

function listOf(title, numbers) {
  if (!numbers.length) return [];
  return [element("h3", {}, title), element("ul", {}, ...numbers.map((number) => element("li", {}, study.texts[number])))];
}

// Only links into the folder beside the page; nothing with a scheme of its own.
const beside = (link) => !/^[a-z][a-z0-9+.-]*:|^\/\//i.test(link);

function runOf(place) {
  const kept = study.kept[place];
  const again = `${study.again} ${study.number[place]}`;
  if (!kept || !beside(kept[0])) return [element("p", {}, "Its run folder was not kept. To make it: ", element("code", {}, again))];
  const parts = [element("p", {}, "Its checked run: ", element("a", {href: kept[0]}, decodeURIComponent(kept[0])), ", with ",
    element("a", {href: kept[0].replace(/\/?$/, "/summary.md")}, "summary.md"), ".")];
  const pictures = kept[1].filter(beside).map((link) => {
    const image = element("img", {src: link, alt: link, loading: "lazy"});
    const name = decodeURIComponent(link.split("/").pop());
    const frame = element("figure", {}, element("a", {href: link}, image), element("figcaption", {}, name));
    image.addEventListener("error", () => { image.replaceWith(element("span", {}, `${name} is no longer there`)); });
    return frame;
  });
  return pictures.length ? [...parts, element("div", {class: "pictures"}, ...pictures)] : parts;
}

function showVariant(number, scroll) {
  const place = placeOf.get(number);
  const note = document.getElementById("ask-note");
  if (place === undefined) {
    note.textContent = count ? `There is no variant ${number}: they go from ${study.number[0]} to ${study.number[count - 1]}, less those left out.` : "There are no variants.";
    return;
  }
  note.textContent = "";
  document.getElementById("wanted").value = number;
  const word = wordOf(place);
  const parts = [element("h3", {}, `Variant ${number}: ${marked(word)}${verdictOf(place) ? ", limits " + marked(verdictOf(place)) : ""}`)];
  const values = element("table", {class: "values"}, element("tbody", {}, ...study.axes.map((axis) =>
    element("tr", {}, element("th", {scope: "row"}, axis.name), element("td", {}, axisText(axis, place))))));
  if (study.aim.words) values.tBodies[0].append(element("tr", {}, element("th", {scope: "row"}, "aim"), element("td", {}, written(study.aim.values[place], study.aim.unit))));
  const side = element("div", {class: "side"}, values);
  if (isFinished(place)) side.append(rowsOf(["figure", "solid", "beam", "difference", "judgement"], figureRows(place)));
  parts.push(side);
  if (word === "failed") {
    parts.push(element("p", {class: "notice"}, `Failed in stage ${study.texts[study.stage[place]] || "-"}: ${study.texts[study.reason[place]]}`));
  }
  if (study.safer[place] >= 0) parts.push(element("p", {}, `On a safer mesh; the first attempt had failed: ${study.texts[study.safer[place]]}`));
  const limits = limitRows(place);
  if (limits.length) parts.push(element("h3", {}, "Limits"), rowsOf(["limit", "quantity", "found", "given", "left", "verdict", "why"], limits));
  parts.push(...listOf("Suspicions", study.suspicions[place]), ...listOf("Cautions", study.cautions[place]));
  if (isFinished(place)) parts.push(element("p", {class: "quiet"}, `${study.unknowns[place]} unknowns, ${written(study.seconds[place], "s")}.`));
  if (word !== "not run yet") parts.push(...runOf(place));
  document.getElementById("detail").replaceChildren(...parts);
  if (scroll) document.getElementById("variant").scrollIntoView();
}

function startVariant() {
  document.addEventListener("click", (event) => {
    const button = event.target.closest("button.look");
    if (button) showVariant(Number(button.dataset.number), true);
  });
  document.getElementById("ask").addEventListener("submit", (event) => {
    event.preventDefault();
    const text = document.getElementById("wanted").value.trim();
    showVariant(/^\d+$/.test(text) ? Number(text) : text, false);
  });
  const first = study.top >= 0 ? study.top : study.misses.length ? study.misses[0] : study.ranking.length ? study.ranking[0] : 0;
  if (count) showVariant(study.number[first], false);
}
