// The map itself: outlines, flows, customers, symbols; layers to switch, goods to choose, one site to single out.
"use strict";

siting.data = JSON.parse(document.getElementById("payload").textContent);
siting.groups = {};
siting.state = { good: -1, selected: null };
siting.pens = {};

siting.options = {
  zoomSnap: 0.1, zoomDelta: 0.5, wheelPxPerZoomLevel: 110, zoomAnimation: false, fadeAnimation: false, markerZoomAnimation: false,
  attributionControl: false, zoomControl: false, maxBoundsViscosity: 1, bounceAtZoomLimits: false, maxZoom: 12, worldCopyJump: false,
};

// Steps of whole numbers back to latitudes and longitudes.
siting.line = function (steps, unit) {
  const points = [];
  for (let i = 0, lat = 0, lon = 0; i < steps.length; i += 2) points.push([(lat += steps[i]) * unit, (lon += steps[i + 1]) * unit]);
  return points;
};

// Coasts are drawn without the straight edges where outlines were cut: the sides of the box and the antimeridian.
siting.coasts = function (rings, wide) {
  const cuts = [wide[1], wide[3], -180, 180, 540], level = [wide[0], wide[2]];
  const same = (a, b, values) => values.some((value) => Math.abs(a - value) < 0.011 && Math.abs(b - value) < 0.011);
  const lines = [];
  for (const ring of rings) {
    let part = [ring[0]];
    for (let i = 1; i < ring.length; i++) {
      const [a, b] = [ring[i - 1], ring[i]];
      if (same(a[1], b[1], cuts) || same(a[0], b[0], level)) {
        if (part.length > 1) lines.push(part);
        part = [b];
      } else part.push(b);
    }
    if (part.length > 1) lines.push(part);
  }
  return lines;
};

siting.drawBase = function (map) {
  const base = siting.data.base, unit = 10 ** -base.decimals;
  map.createPane("base").style.zIndex = 250;
  map.createPane("labels").style.zIndex = 640;
  map.getPane("base").style.pointerEvents = map.getPane("labels").style.pointerEvents = "none";
  const renderer = L.svg({ pane: "base", padding: 0.6 });
  const shape = (className) => ({ pane: "base", renderer, interactive: false, className, fillRule: "evenodd", noClip: false, smoothFactor: 0.7 });
  const land = base.land.map((steps) => siting.line(steps, unit));
  L.polygon([land], { ...shape("land"), stroke: true, weight: 0.8, color: siting.data.colours.paper, fillOpacity: 1 }).addTo(map);
  L.polygon([base.lakes.map((steps) => siting.line(steps, unit))], { ...shape("lake"), stroke: false, fillOpacity: 1 }).addTo(map);
  L.polyline(siting.coasts(land, base.wide), { ...shape("coast"), weight: 0.9, fill: false }).addTo(map);
  L.polyline(base.borders.map((steps) => siting.line(steps, unit)), { ...shape("border"), weight: 1.1, fill: false }).addTo(map);
};

siting.load = (loads) => (siting.state.good < 0 ? loads.reduce((sum, load) => sum + load, 0) : loads[siting.state.good]);
siting.width = (leg, load) => siting.scale * Math.max(leg.hair, (load / leg.most) * leg.widest);
// Dashes grow with the line, so that a wide one still reads as dashed and not as a ladder.
siting.dashes = (leg, width) => (leg.dashes ? leg.dashes.split(" ").map((dash) => Math.max(1, width / 4) * dash).join(" ") : null);
siting.radius = (load) => siting.scale * Math.max(siting.data.dots.smallest, Math.sqrt(load / siting.data.dots.most) * siting.data.dots.largest);

siting.ends = { outbound: ["sites", "customers"], inbound: ["suppliers", "sites"], direct: ["suppliers", "customers"] };

siting.touches = function (lane, selected) {
  const [start, end] = siting.ends[lane.leg];
  return (start === selected.kind && lane.from === selected.index) || (end === selected.kind && lane.to === selected.index);
};

siting.bindCard = function (layer, title, heads, facts, sticky) {
  layer.bindTooltip(() => siting.card(title, heads, facts), { sticky, className: "tip", opacity: 1, offset: sticky ? [10, 0] : [0, 0] });
};

siting.makeLanes = function () {
  const data = siting.data;
  for (const leg of data.legs) siting.pens[leg.pen || leg.leg] = leg;
  for (const lane of data.lanes) {
    const [start, end] = siting.ends[lane.leg], from = data[start][lane.from], to = data[end][lane.to];
    if (!from.spot || !to.spot) continue;
    const pen = siting.pens[lane.pen || lane.leg];
    lane.drawn = L.polyline([from.spot, to.spot], {
      renderer: siting.canvas, color: pen.colour, lineCap: pen.dashes ? "butt" : "round", smoothFactor: 0,
    });
    siting.bindCard(lane.drawn, [from.name, to.name], data.lane_heads, lane.facts, true);
  }
};

siting.makeCustomers = function () {
  const data = siting.data;
  data.customers.forEach((customer, index) => {
    if (!customer.spot) return;
    const shade = customer.band === null ? data.colours.ink : data.shades[customer.band], hollow = customer.beyond || customer.band === null;
    customer.drawn = L.circleMarker(customer.spot, {
      renderer: siting.canvas, fillColor: hollow ? data.colours.paper : shade, fillOpacity: 1,
      color: hollow ? shade : data.colours.paper, weight: hollow ? 2 : 0.8, dashArray: customer.band === null ? "2 2" : null, bubblingMouseEvents: false,
    });
    siting.bindCard(customer.drawn, [customer.name], data.customer_heads, customer.facts, true);
    customer.drawn.on("click", () => siting.select("customers", index));
  });
};

siting.makeMarkers = function (kind, word) {
  const data = siting.data, group = siting.groups[kind];
  data[kind].forEach((thing, index) => {
    if (!thing.spot) return;
    const size = thing.symbol.size_px * siting.scale;
    const html = siting.symbol(thing.symbol, thing.level === undefined ? null : thing.level, thing.active);
    const icon = L.divIcon({ html, className: `symbol ${kind}`, iconSize: [size, size], iconAnchor: [size / 2, size / 2] });
    thing.drawn = L.marker(thing.spot, { icon, riseOnHover: true, zIndexOffset: thing.active ? 1000 : 0 });
    siting.bindCard(thing.drawn, [thing.name], data[`${word}_heads`], thing.facts, false);
    thing.drawn.on("add", () => {
      const shown = thing.drawn.getElement();
      shown.setAttribute("role", "button");
      shown.setAttribute("aria-label", `${word} ${thing.name}, ${thing.facts.filter(Boolean).join(", ")}`);
      L.DomEvent.disableClickPropagation(shown);
      L.DomEvent.on(shown, "keydown", (event) => {
        if (event.key !== "Enter" && event.key !== " ") return;
        L.DomEvent.stop(event);
        siting.select(kind, index);
      });
    });
    thing.drawn.on("click", () => siting.select(kind, index));
    group.addLayer(thing.drawn);
  });
};

// Widths, sizes and fading, after a good was chosen or something singled out.
siting.restyle = function () {
  const { data, state, groups } = siting;
  const near = { sites: new Set(), suppliers: new Set(), customers: new Set() };
  if (state.selected) near[state.selected.kind].add(state.selected.index);
  for (const lane of data.lanes) {
    if (!lane.drawn) continue;
    const load = siting.load(lane.load), strong = !state.selected || siting.touches(lane, state.selected);
    if (strong && state.selected && load > 0) {
      near[siting.ends[lane.leg][0]].add(lane.from);
      near[siting.ends[lane.leg][1]].add(lane.to);
    }
    const group = groups[lane.leg];
    if (load > 0) {
      const pen = siting.pens[lane.pen || lane.leg], weight = siting.width(pen, load);
      lane.drawn.setStyle({ weight, dashArray: siting.dashes(pen, weight), opacity: strong ? (lane.leg === "inbound" ? 0.85 : 0.72) : 0.07 });
      if (!group.hasLayer(lane.drawn)) group.addLayer(lane.drawn);
    } else group.removeLayer(lane.drawn);
  }
  data.customers.forEach((customer, index) => {
    if (!customer.drawn) return;
    const load = siting.load(customer.load), strong = !state.selected || near.customers.has(index);
    if (load > 0) {
      customer.drawn.setStyle({ fillOpacity: strong ? 1 : 0.15, opacity: strong ? 1 : 0.15 });
      customer.drawn.setRadius(siting.radius(load));
      if (!groups.customers.hasLayer(customer.drawn)) groups.customers.addLayer(customer.drawn);
    } else groups.customers.removeLayer(customer.drawn);
  });
  for (const kind of ["sites", "suppliers"])
    data[kind].forEach((thing, index) => thing.drawn && thing.drawn.setOpacity(!state.selected || near[kind].has(index) ? 1 : 0.3));
  siting.order();
};

// One canvas for all that is hovered: keep inbound below direct below outbound below customers, whatever was switched.
siting.order = function () {
  for (const key of ["inbound", "direct", "outbound", "customers"])
    if (siting.map.hasLayer(siting.groups[key])) siting.groups[key].eachLayer((layer) => layer.bringToFront());
};

// Paper takes lines, the screen dots: the same items, drawn as SVG while printing.
siting.drawWith = function (renderer) {
  for (const key of ["inbound", "direct", "outbound", "customers"]) siting.groups[key].clearLayers();
  for (const item of [...siting.data.lanes, ...siting.data.customers]) if (item.drawn) item.drawn.options.renderer = renderer;
  siting.canvas.remove(); // printed empty it would hide the outlines below it; the one in use adds itself again
  siting.print.remove();
  siting.restyle();
};

siting.select = function (kind, index) {
  const now = siting.state.selected;
  siting.state.selected = now && now.kind === kind && now.index === index ? null : { kind, index };
  siting.restyle();
  siting.showSelected();
};

siting.fit = function () {
  const box = siting.data.base.box;
  siting.map.fitBounds([[box[0], box[1]], [box[2], box[3]]], { padding: [10, 10], animate: false });
};

siting.hold = function () {
  const wide = siting.data.base.wide, bounds = L.latLngBounds([[wide[0], wide[1]], [wide[2], wide[3]]]);
  siting.map.setMinZoom(0);
  siting.map.setMaxBounds(null);
  siting.fit();
  siting.map.setMinZoom(Math.min(siting.map.getBoundsZoom(bounds, true), siting.map.getZoom()));
  siting.map.setMaxBounds(bounds);
};

siting.wantedLabels = function () {
  const { data, map, groups } = siting, wanted = [];
  const strong = { name: "strong", size: 13, weight: 650, rank: 0 }, plain = { name: "plain", size: 12, weight: 450, rank: 1 };
  const town = { name: "town", size: 11, weight: 400, rank: 2 };
  const add = (kind, active) => {
    if (!map.hasLayer(groups[kind])) return;
    for (const thing of data[kind])
      if (thing.spot && thing.active === active)
        wanted.push({ lat: thing.spot[0], lon: thing.spot[1], half: (siting.scale * thing.symbol.size_px) / 2, text: thing.label, extra: thing.level_text, style: active && kind === "sites" ? strong : plain });
  };
  add("sites", true);
  add("suppliers", true);
  add("sites", false);
  add("suppliers", false);
  for (const [name, lat, lon] of data.base.towns) wanted.push({ lat, lon, half: 1, text: name, style: town });
  return wanted;
};

siting.obstacles = function () {
  const { data, map, groups } = siting, found = { symbols: [], dots: [], lines: [] };
  const spot = (thing) => ({ lat: thing.spot[0], lon: thing.spot[1] });
  for (const kind of ["sites", "suppliers"])
    if (map.hasLayer(groups[kind]))
      for (const thing of data[kind]) if (thing.spot) found.symbols.push({ ...spot(thing), half: (siting.scale * thing.symbol.size_px) / 2 + 1 });
  if (map.hasLayer(groups.customers))
    for (const customer of data.customers)
      if (customer.drawn && siting.load(customer.load) > 0) found.dots.push({ ...spot(customer), half: siting.radius(siting.load(customer.load)) * 0.85 });
  for (const lane of data.lanes)
    if (lane.drawn && siting.load(lane.load) > 0 && map.hasLayer(groups[lane.leg])) {
      const [start, end] = siting.ends[lane.leg];
      found.lines.push([spot(data[start][lane.from]), spot(data[end][lane.to])]);
    }
  return found;
};

siting.named = function () {
  for (const word of ["site", "supplier"]) {
    const symbols = new Map(siting.data[`${word}_symbols`].map((symbol) => [symbol.key, symbol]));
    for (const thing of siting.data[`${word}s`]) thing.symbol = symbols.get(thing.key);
  }
};

// Called once the map and its layers are there.
siting.start = function (map) {
  siting.map = map;
  siting.named();
  siting.panels();
  if (!siting.data.base) {
    document.body.classList.add("placeless");
    return;
  }
  map.invalidateSize({ animate: false, pan: false }); // the panels have taken their room
  siting.canvas = L.canvas({ padding: 0.3, tolerance: 3 });
  siting.print = L.svg({ padding: 0.1 });
  L.control.zoom({ position: "topleft", zoomInTitle: "Closer", zoomOutTitle: "Farther" }).addTo(map);
  L.control.scale({ imperial: false, position: "bottomleft", maxWidth: 120 }).addTo(map);
  siting.hold();
  siting.drawBase(map);
  siting.makeLanes();
  siting.makeCustomers();
  siting.makeMarkers("suppliers", "supplier");
  siting.makeMarkers("sites", "site");
  siting.restyle();
  siting.labels = new siting.Labels(siting.wantedLabels, siting.obstacles).addTo(map);
  map.on("click", () => siting.state.selected && siting.select(siting.state.selected.kind, siting.state.selected.index));
  map.on("resize", siting.hold);
};
