// Labels that never overlap: sites in use first, then suppliers, then the rest, then towns, the largest first.
"use strict";

siting.Labels = L.Layer.extend({
  initialize: function (wanted, obstacles) {
    this.wanted = wanted; // () => [{lat, lon, half, text, extra, style, far}]
    this.obstacles = obstacles; // () => {symbols: [{lat, lon, half}], dots: the same, lines: [[{lat, lon}, {lat, lon}]]}
  },
  onAdd: function (map) {
    this.root = siting.svg("svg", { class: "labels", "aria-hidden": "true" });
    map.getPane("labels").appendChild(this.root);
    this.pen = document.createElement("canvas").getContext("2d");
    map.on("moveend zoomend viewreset resize", this.redraw, this);
    this.redraw();
  },
  onRemove: function (map) {
    map.off("moveend zoomend viewreset resize", this.redraw, this);
    this.root.remove();
  },
  // Boxes (left, top, width, height) around a point at which a text of this width may stand, best first.
  spots: function (x, y, half, width, height) {
    const gap = half + 4, up = y - height / 2;
    return [
      [x + gap, up], [x - gap - width, up], [x - width / 2, y + gap - 1], [x - width / 2, y - gap - height + 1],
      [x + gap - 2, y + gap - 5], [x + gap - 2, y - gap - height + 5], [x - gap - width + 2, y + gap - 5], [x - gap - width + 2, y - gap - height + 5],
    ].map(([left, top]) => [left, top, width, height]);
  },
  redraw: function () {
    const map = this._map, size = map.getSize(), origin = map.containerPointToLayerPoint([0, 0]);
    L.DomUtil.setPosition(this.root, origin);
    this.root.setAttribute("width", size.x);
    this.root.setAttribute("height", size.y);
    this.root.replaceChildren();
    const at = (thing) => map.latLngToContainerPoint([thing.lat, thing.lon]);
    const around = (thing) => {
      const point = at(thing);
      return [point.x - thing.half, point.y - thing.half, 2 * thing.half, 2 * thing.half];
    };
    const { symbols, dots, lines } = this.obstacles();
    const corner = [[0, 0, 84, 140], [0, size.y - 40, 150, 40]]; // where the buttons and the scale stand
    const hard = [...symbols.map(around), ...corner], soft = dots.map(around);
    const segments = lines.map((line) => [at(line[0]), at(line[1])]);
    const meets = (box, other) => box[0] < other[0] + other[2] && other[0] < box[0] + box[2] && box[1] < other[1] + other[3] && other[1] < box[1] + box[3];
    const clear = (box) => box[0] >= 3 && box[1] >= 3 && box[0] + box[2] <= size.x - 3 && box[1] + box[3] <= size.y - 3 && !hard.some((other) => meets(box, other));
    const tidy = (box) => clear(box) && !soft.some((other) => meets(box, other));
    const crossed = (box) => L.bounds([box[0] + 1, box[1] + 2], [box[0] + box[2] - 1, box[1] + box[3] - 2]);
    const open = (box) => tidy(box) && !segments.some(([from, to]) => L.LineUtil.clipSegment(from, to, crossed(box)));
    const scale = parseFloat(getComputedStyle(document.documentElement).fontSize) / 16;
    const family = getComputedStyle(map.getContainer()).fontFamily;
    for (const label of this.wanted()) {
      const point = at(label);
      if (point.x < 0 || point.y < 0 || point.x > size.x || point.y > size.y) continue;
      const px = label.style.size * scale;
      this.pen.font = `${label.style.weight} ${px}px ${family}`;
      const gap = label.extra ? px * 0.4 : 0;
      const own = this.pen.measureText(label.text).width;
      this.pen.font = `400 ${px * 0.92}px ${family}`;
      const width = own + gap + (label.extra ? this.pen.measureText(label.extra).width : 0) + 2;
      const spots = this.spots(point.x, point.y, label.half, width, px * 1.2);
      // A town gives way to everything; a site in use rather covers a customer than stays without its name.
      const box = spots.find(open) || (label.style.rank < 2 && spots.find(tidy)) || (label.style.rank < 1 && spots.find(clear));
      if (!box) continue;
      hard.push(box);
      if (label.style.rank < 2) siting.svg("rect", { x: box[0] - 1.5, y: box[1], width: width + 2, height: px * 1.25, rx: 2.5, class: "plate" }, this.root);
      const y = box[1] + px * 0.95;
      const text = siting.svg("text", { x: box[0], y, class: `label ${label.style.name}`, "font-size": px, "font-weight": label.style.weight }, this.root);
      text.textContent = label.text;
      if (label.extra) {
        const extra = siting.svg("text", { x: box[0] + own + gap, y, class: "label extra", "font-size": px * 0.92 }, this.root);
        extra.textContent = label.extra;
      }
    }
  },
});
