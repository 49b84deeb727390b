// Symbols as SVG, and small helpers that build elements from text only.
"use strict";
const siting = {};

siting.element = function (tag, className, text) {
  const made = document.createElement(tag);
  if (className) made.className = className;
  if (text !== undefined) made.textContent = text;
  return made;
};

// A name a user typed: isolated, so that right-to-left marks in it cannot turn the text around it.
siting.name = function (text, className) {
  return siting.element("bdi", className, text);
};

siting.svg = function (tag, attributes, parent) {
  const made = document.createElementNS("http://www.w3.org/2000/svg", tag);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  if (parent) parent.appendChild(made);
  return made;
};

// On a large screen text grows (map.css); symbols, dots and lines grow with it.
siting.scale = Math.max(1, parseFloat(getComputedStyle(document.documentElement).fontSize) / 14.4);

siting.canvasSvg = function (width, height, scale = 1) {
  const size = { width: width * scale, height: height * scale, viewBox: `0 0 ${width} ${height}` };
  return siting.svg("svg", { ...size, "aria-hidden": "true", focusable: "false", overflow: "visible" });
};

// A rounded square that fills from the bottom with `level` (null = no capacity to fill: a dot).
siting.square = function (symbol, level, active, root) {
  const s = symbol.size_px, paper = siting.data.colours.paper;
  const stroke = symbol.outlines > 1 ? 1.8 : active ? 2.2 : 1.6;
  const dashes = symbol.dashed ? { "stroke-dasharray": s < 18 ? "2.6 2" : "3.6 2.6" } : {};
  const box = (inset, radius, attributes) =>
    siting.svg("rect", { x: inset, y: inset, width: s - 2 * inset, height: s - 2 * inset, rx: radius, ...attributes }, root);
  box(stroke / 2, s * 0.24, { fill: paper, stroke: symbol.outline, "stroke-width": stroke, ...dashes });
  let inner = stroke + 1.3;
  if (symbol.outlines > 1) {
    box(stroke + 2.2, s * 0.15, { fill: "none", stroke: symbol.outline, "stroke-width": stroke });
    inner = 2 * stroke + 2.9;
  }
  if (symbol.fill && level !== null) {
    const side = s - 2 * inner, height = side * Math.min(1, Math.max(0, level));
    siting.svg("rect", { x: inner, y: s - inner - height, width: side, height, rx: Math.min(1.6, height / 2), fill: symbol.fill }, root);
  } else if (symbol.fill && active) {
    siting.svg("circle", { cx: s / 2, cy: s / 2, r: s * 0.1, fill: symbol.fill }, root);
  }
};

siting.triangle = function (symbol, root) {
  const s = symbol.size_px, paper = siting.data.colours.paper;
  const path = (inset) => `M${s / 2} ${inset * 1.9} L${s - inset * 1.5} ${s - inset} L${inset * 1.5} ${s - inset} Z`;
  const dashes = symbol.dashed ? { "stroke-dasharray": "3.4 2.4" } : {};
  const line = { stroke: symbol.outline, "stroke-width": 1.6, "stroke-linejoin": "round", ...dashes };
  siting.svg("path", { d: path(1), fill: symbol.outlines > 1 ? paper : symbol.fill || paper, ...line }, root);
  if (symbol.outlines > 1) siting.svg("path", { d: path(4.6), fill: symbol.fill, ...line, "stroke-width": 0.6 }, root);
};

siting.symbol = function (symbol, level, active) {
  const s = symbol.size_px, root = siting.canvasSvg(s, s, siting.scale);
  if (symbol.shape === "square") siting.square(symbol, level, active, root);
  else siting.triangle(symbol, root);
  if (symbol.barred) {
    const bar = (width, stroke) => siting.svg("line", { x1: 0.5, y1: s - 0.5, x2: s - 0.5, y2: 0.5, stroke, "stroke-width": width, "stroke-linecap": "round" }, root);
    bar(5, siting.data.colours.paper);
    bar(2.2, symbol.outline);
  }
  return root;
};

// A card of facts: what a tooltip shows.
siting.card = function (title, heads, facts) {
  const card = siting.element("div", "card");
  const head = siting.element("div", "card-title");
  title.forEach((part, i) => {
    if (i) head.append(" \u2192 ");
    head.append(siting.name(part));
  });
  card.append(head);
  const list = siting.element("dl");
  facts.forEach((fact, i) => {
    if (fact === "") return;
    list.append(siting.element("dt", "", heads[i]));
    const told = siting.element("dd");
    told.append(siting.name(fact));
    list.append(told);
  });
  card.append(list);
  return card;
};
