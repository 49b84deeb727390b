// What stands around the map: headline, verdict list, legend with its switches, notes, tables; and printing.
"use strict";

siting.group = function (key) {
  siting.groups[key] = L.layerGroup();
  return siting.groups[key];
};

siting.panels = function () {
  const data = siting.data;
  document.title = data.title ? `${data.title}: ${{ plan: "plan", differences: "what differs" }[data.kind] || "what was given"}` : "Map";
  document.getElementById("title").append(siting.name(data.title || "Untitled study"));
  document.getElementById("headline").append(siting.name(data.headline));
  document.body.classList.toggle("embedded", !data.headline); // inside a page that says the rest
  siting.verdictList();
  siting.legend();
  siting.foot();
  siting.tables();
  siting.keys();
};

siting.verdictList = function () {
  const root = document.getElementById("verdicts"), data = siting.data;
  for (const [kind, word] of [["sites", "site"], ["suppliers", "supplier"]]) {
    for (const symbol of data[`${word}_symbols`]) {
      const rows = data[kind].map((thing, index) => [thing, index]).filter(([thing]) => thing.key === symbol.key);
      if (!rows.length) continue;
      const part = siting.element("section");
      const head = siting.element("h2");
      head.append(siting.symbol(symbol, symbol.fill ? 0.6 : null, rows[0][0].active), siting.element("span", "verdict", symbol.key), siting.element("span", "count", `${rows.length} ${rows.length === 1 ? word : kind}`));
      part.append(head);
      const plain = rows.every(([thing]) => !thing.brief && !thing.note);
      const list = siting.element("ul", rows[0][0].active ? "rows" : plain ? "rows flowing" : "rows tight");
      for (const [thing, index] of rows) {
        const item = siting.element("li");
        const button = siting.element("button", "row");
        button.type = "button";
        button.setAttribute("aria-pressed", "false");
        button.append(siting.name(thing.name, "who"));
        if (thing.level_text) button.append(siting.element("span", "level", thing.level_text));
        if (thing.brief) button.append(siting.element("span", "brief", thing.brief));
        if (thing.note) button.append(siting.element("span", "note", thing.note));
        if (siting.data.base && thing.spot) button.addEventListener("click", () => siting.select(kind, index));
        thing.row = button;
        item.append(button);
        list.append(item);
      }
      part.append(list);
      root.append(part);
    }
  }
};

siting.showSelected = function () {
  const selected = siting.state.selected;
  for (const kind of ["sites", "suppliers"])
    siting.data[kind].forEach((thing, index) => thing.row && thing.row.setAttribute("aria-pressed", String(Boolean(selected && selected.kind === kind && selected.index === index))));
  const said = document.getElementById("said");
  said.replaceChildren();
  if (!selected) return;
  said.append("Singled out: ", siting.name(siting.data[selected.kind][selected.index].name, "who"), ". Escape or a second click shows all.");
};

siting.switcher = function (root, key, text, more) {
  const label = siting.element("label", "switch");
  const box = siting.element("input");
  box.type = "checkbox";
  box.checked = true;
  box.id = `switch-${key}`;
  label.append(box, siting.element("span", "", text));
  if (more) label.append(siting.element("span", "more", more));
  box.addEventListener("change", () => {
    if (box.checked) siting.map.addLayer(siting.groups[key]);
    else siting.map.removeLayer(siting.groups[key]);
    siting.restyle();
    siting.labels.redraw();
  });
  root.append(label);
};

siting.entry = function (list, drawing, text, more) {
  const item = siting.element("li");
  const swatch = siting.element("span", "swatch");
  swatch.append(drawing);
  item.append(swatch, siting.element("span", "", text));
  if (more) item.append(siting.element("span", "more", more));
  list.append(item);
};

siting.legendPart = function (root, key, text, more, switched = true) {
  const part = siting.element("section");
  if (siting.data.base && switched) siting.switcher(part, key, text, more);
  else {
    const head = siting.element("h3", "", text);
    if (more) head.append(" ", siting.name(more, "more"));
    part.append(head);
  }
  const list = siting.element("ul", "keys");
  part.append(list);
  root.append(part);
  return list;
};

siting.legend = function () {
  const root = document.getElementById("legend"), data = siting.data;
  if (data.goods.length > 1 && data.base) siting.goodsChoice(root);
  for (const [kind, word, text] of [["sites", "site", "Sites"], ["suppliers", "supplier", "Suppliers"]]) {
    if (!data[kind].length) continue;
    const list = siting.legendPart(root, kind, text, kind === "sites" && data.kind !== "given" ? "level: utilisation" : "");
    for (const symbol of data[`${word}_symbols`])
      if (data[kind].some((thing) => thing.key === symbol.key)) siting.entry(list, siting.symbol(symbol, symbol.fill ? 0.6 : null, true), symbol.key, symbol.meaning);
    if (kind === "sites" && data.kind !== "given") {
      const told = data.sites.some((site) => site.active && site.level === null) && "a dot where capacity is unlimited";
      if (told) list.append(siting.element("li", "told", told));
    }
  }
  siting.customerLegend(root);
  const words = { outbound: ["Outbound", "site to customer"], inbound: ["Inbound", "supplier to site"], direct: ["Direct", "supplier to customer"] };
  for (const leg of data.legs) if (leg.most > 0) siting.legLegend(root, leg, leg.words || words[leg.leg]);
  root.append(siting.element("p", "told", data.amounts_text));
};

siting.customerLegend = function (root) {
  const data = siting.data, list = siting.legendPart(root, "customers", "Customers", "area: demand");
  const sizes = siting.element("li", "sizes");
  for (const [load, text] of data.dots.samples) {
    const picture = siting.canvasSvg(20, 18);
    siting.svg("circle", { cx: 10, cy: 9, r: siting.radius(load), fill: data.shades[2] }, picture);
    const swatch = siting.element("span", "swatch");
    swatch.append(picture);
    sizes.append(swatch, siting.element("span", "", text));
  }
  list.append(sizes);
  if (data.bands.length) list.append(siting.element("li", "told", data.bands.some((band) => band.share) ? "shade: road distance, share of load" : "shade: road distance"));
  for (const band of data.bands) {
    const picture = siting.canvasSvg(20, 14);
    siting.svg("circle", { cx: 10, cy: 7, r: 5, fill: data.shades[band.band] }, picture);
    siting.entry(list, picture, band.text, band.share);
  }
  if (data.customers.some((customer) => customer.band === null)) {
    const picture = siting.canvasSvg(20, 14);
    siting.svg("circle", { cx: 10, cy: 7, r: 4.5, fill: data.colours.paper, stroke: data.colours.ink, "stroke-width": 2, "stroke-dasharray": "2 2" }, picture);
    siting.entry(list, picture, "distance not known");
  }
  if (data.service_text) {
    const picture = siting.canvasSvg(20, 14);
    siting.svg("circle", { cx: 10, cy: 7, r: 5, fill: data.colours.paper, stroke: data.shades[4], "stroke-width": 2 }, picture);
    siting.entry(list, picture, data.service_text);
  }
};

siting.legLegend = function (root, leg, [text, more]) {
  const list = siting.legendPart(root, leg.leg, text, more, !leg.pen);
  const sample = (width) => {
    const picture = siting.canvasSvg(34, 14), cap = leg.dashes ? "butt" : "round";
    siting.svg("line", { x1: 2, x2: 32, y1: 7, y2: 7, stroke: leg.colour, "stroke-width": width, "stroke-dasharray": siting.dashes(leg, width) || "none", "stroke-linecap": cap }, picture);
    return picture;
  };
  for (const [load, amount] of leg.samples) siting.entry(list, sample(siting.width(leg, load)), amount);
  siting.entry(list, sample(leg.hair), leg.hair_text);
};

siting.goodsChoice = function (root) {
  const part = siting.element("fieldset", "goods");
  part.append(siting.element("legend", "", "Goods"));
  ["all", ...siting.data.goods].forEach((good, i) => {
    const label = siting.element("label", "switch");
    const dot = siting.element("input");
    dot.type = "radio";
    dot.name = "good";
    dot.checked = i === 0;
    dot.id = `good-${i}`;
    dot.addEventListener("change", () => {
      siting.state.good = i - 1;
      siting.restyle();
      siting.labels.redraw();
    });
    label.append(dot, siting.name(good));
    part.append(label);
  });
  root.append(part);
};

siting.foot = function () {
  const data = siting.data, notes = document.getElementById("notes"), sources = document.getElementById("sources");
  for (const text of [...data.notes, ...data.cautions]) notes.append(siting.element("span", "", `${text} `));
  const parts = [data.attribution, "Leaflet"];
  sources.textContent = parts.join(" \u00b7 ");
  if (data.fingerprint) sources.prepend(siting.element("span", "study", `Study ${data.fingerprint}`));
};

// Tables are built when they are opened: a thousand rows need not wait for nobody.
siting.tables = function () {
  const root = document.getElementById("tables"), data = siting.data;
  for (const [kind, heads, text] of [["sites", data.site_heads, "Sites"], ["suppliers", data.supplier_heads, "Suppliers"], ["customers", data.customer_heads, "Customers"]]) {
    if (!data[kind].length) continue;
    const details = siting.element("details");
    details.append(siting.element("summary", "", `${text} as a table (${data[kind].length})`));
    details.addEventListener("toggle", () => details.open && details.children.length < 2 && details.append(siting.table(text, heads, data[kind])));
    root.append(details);
  }
  if (!data.warnings.length) return;
  const details = siting.element("details");
  details.append(siting.element("summary", "", `Worth knowing (${data.warnings.length})`));
  const list = siting.element("ul", "warnings");
  for (const warning of data.warnings) {
    const item = siting.element("li");
    item.append(siting.name(warning));
    list.append(item);
  }
  details.append(list);
  root.append(details);
};

siting.table = function (text, heads, rows) {
  const frame = siting.element("div", "frame"), table = siting.element("table"), head = siting.element("tr");
  frame.tabIndex = 0;
  table.append(siting.element("caption", "", text));
  for (const word of ["Name", ...heads]) {
    const cell = siting.element("th", "", word);
    cell.scope = "col";
    head.append(cell);
  }
  const top = siting.element("thead");
  top.append(head);
  const body = siting.element("tbody");
  for (const thing of rows) {
    const row = siting.element("tr"), first = siting.element("th");
    first.scope = "row";
    first.append(siting.name(thing.name));
    row.append(first);
    for (const fact of thing.facts) {
      const cell = siting.element("td", /^-?[\d.,]+\u00a0/.test(fact) ? "figure" : "");
      cell.append(siting.name(fact || "\u2013"));
      row.append(cell);
    }
    body.append(row);
  }
  table.append(top, body);
  frame.append(table);
  return frame;
};

siting.keys = function () {
  document.addEventListener("keydown", (event) => {
    if (event.key === "Escape" && siting.state.selected) siting.select(siting.state.selected.kind, siting.state.selected.index);
  });
  if (!siting.data.base) return;
  document.getElementById("all").addEventListener("click", siting.fit);
  window.addEventListener("beforeprint", () => siting.forPrint(true));
  window.addEventListener("afterprint", () => siting.forPrint(false));
};

// One page: the sheet takes the size of the paper, and the list shrinks until all of it is there.
siting.forPrint = function (printing) {
  document.body.classList.toggle("printing", printing);
  siting.drawWith(printing ? siting.print : siting.canvas);
  siting.map.invalidateSize({ animate: false, pan: false });
  siting.hold();
  for (const id of ["verdicts", "legend"]) {
    const list = document.getElementById(id);
    list.style.fontSize = "";
    for (let px = 11; printing && px > 5 && list.scrollHeight > list.clientHeight; px -= 0.5) list.style.fontSize = `${px}px`;
  }
};
