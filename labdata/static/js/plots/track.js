// Depth tracks side by side over one depth axis; down is deeper. One strip of canvas holds them all.

import { FONT, FONT_STRONG, INK, LINE, SOFT, drawX, fitText, frame } from "./axis.js";
import { Grid, Points } from "./grid.js";
import { caught } from "./lasso.js";
import { ARROWS, lookOf } from "./marks.js";
import { Scale, domainOf, extent, held, tickText } from "./scale.js";
import { modeOf } from "./selection.js";

const HEAD = 46, FOOT = 6, DEPTHS = 38, UNITS = 72, GAP = 5, ARROW_ROOM = 12;

export class TrackStrip {
  /** `model`: rows, depth (top, middle, base), bands; `columns`: the tracks to draw. */
  constructor(surface, model, selection, marks, tell) {
    Object.assign(this, { surface, model, selection, marks, tell, columns: [], domains: new Map() });
    this.whole = domainOf(...depthExtent(model));
    this.view = [...this.whole];
    surface.on({
      ground: (pen) => this.draw(pen),
      points: (pen) => this.stamp(pen, null),
      overlay: (pen) => this.overlay(pen),
      pick: (x, y, event) => this.pick(x, y, event),
      area: (path, event) => selection.apply(caught(this.points, path), modeOf(event)),
      pan: (_, dy) => this.#shift(-dy),
      zoom: (x, y, factor, event) => (event.shiftKey ? this.#zoomValues(x, factor) : this.zoom(factor, y)),
      reset: () => this.reset(),
      hover: (x, y) => this.hover(x, y),
    });
    selection.subscribe(() => surface.drawOverlay());
  }

  show(columns) { this.columns = columns; this.surface.redraw(); }

  update(model) { this.model = model; this.whole = domainOf(...depthExtent(model)); }

  reset() { this.view = [...this.whole]; this.domains.clear(); this.surface.redraw(); }

  /** Zoom the values of the one track under the pointer. */
  #zoomValues(x, factor) {
    const place = this.places.find(({ left, right }) => x >= left && x <= right);
    if (!place) return;
    this.domains.set(place.column.key, place.scale.domain.map((end) => place.scale.from(x + (place.scale.to(end) - x) * factor)));
    this.surface.redraw();
  }

  /** Zoom about a pixel, or the middle. Stays inside the well. */
  zoom(factor, y = (HEAD + this.surface.height) / 2) {
    const at = this.depth.from(y), [top, base] = this.view;
    this.#look(at - (at - top) * factor, at + (base - at) * factor);
  }

  #shift(pixels) {
    const by = pixels / this.depth.slope;
    this.#look(this.view[0] + by, this.view[1] + by);
  }

  #look(top, base) {
    const [low, high] = this.whole, span = Math.max(1, Math.min(base - top, high - low));
    const start = Math.min(Math.max(top, low), high - span);
    this.view = [start, start + span];
    this.surface.redraw();
  }

  draw(pen) {
    const { width, height } = this.surface;
    this.box = { left: DEPTHS + UNITS, right: width - 3, top: HEAD, bottom: height - FOOT };
    this.depth = new Scale(this.view, [this.box.top, this.box.bottom]);
    this.points = new Points();
    this.#behind(pen);
    const each = (this.box.right - this.box.left) / Math.max(1, this.columns.length);
    this.places = this.columns.map((column, n) => ({ column, left: this.box.left + n * each + GAP / 2, right: this.box.left + (n + 1) * each - GAP / 2 }));
    this.places.forEach((place, n) => this.#track(pen, place, n));
    this.#tops(pen);
    this.grid = new Grid(this.points);
  }

  /** All marks, or those of the rows that are on. */
  stamp(pen, only) { this.marks.stampAll(pen, this.points, only); }

  /** Depth axis, formations, cores and muds left of the tracks. */
  #behind(pen) {
    const { top, bottom, left } = this.box;
    pen.font = FONT; pen.fillStyle = SOFT; pen.textAlign = "right"; pen.textBaseline = "middle";
    for (const tick of this.depth.ticks((bottom - top) / 60)) {
      pen.fillText(tickText(tick), DEPTHS - 4, this.depth.to(tick));
      pen.fillStyle = LINE; pen.fillRect(DEPTHS, Math.round(this.depth.to(tick)), UNITS, 1); pen.fillStyle = SOFT;
    }
    pen.textAlign = "left"; pen.textBaseline = "bottom";
    pen.font = FONT_STRONG; pen.fillStyle = INK; pen.fillText("MD", 4, 18);
    pen.font = FONT; pen.fillStyle = SOFT; pen.fillText("m", 4, 31);
    this.#muds(pen, left - 8);
    this.#cores(pen, left - 15);
    pen.strokeStyle = "#74827f"; pen.strokeRect(DEPTHS + 0.5, top + 0.5, left - DEPTHS - 2, bottom - top);
  }

  #span(from, to) {
    const y0 = Math.max(this.box.top, this.depth.to(from)), y1 = Math.min(this.box.bottom, this.depth.to(to));
    return y1 > y0 ? [y0, y1 - y0] : null;
  }

  #muds(pen, x) {
    for (const mud of this.model.bands.muds) {
      const span = this.#span(mud.top, mud.base);
      if (!span) continue;
      pen.fillStyle = this.model.figures.bands[`mud_${mud.kind}`] ?? LINE;
      pen.fillRect(x, span[0], 6, span[1]);
      if (mud.kind === "oil" || mud.kind === "synthetic") hatch(pen, x, span[0], 6, span[1]);
    }
  }

  #cores(pen, x) {
    pen.fillStyle = this.model.figures.bands.core;
    for (const core of this.model.bands.cores) {
      const span = this.#span(core.top, core.base);
      if (span) pen.fillRect(x, span[0], 5, Math.max(2, span[1]));
    }
  }

  /** Lines across all tracks: formation tops with names, casing shoes, changes of mud. */
  #tops(pen) {
    const { left, right, top, bottom } = this.box, { tops, casing, muds } = this.model.bands;
    const line = (md, dash, colour, from) => {
      const y = Math.round(this.depth.to(md)) + 0.5;
      if (y < top || y > bottom) return null;
      pen.strokeStyle = colour; pen.setLineDash(dash); pen.beginPath(); pen.moveTo(from, y); pen.lineTo(right, y); pen.stroke(); pen.setLineDash([]);
      return y;
    };
    pen.font = FONT; pen.textAlign = "left"; pen.textBaseline = "top"; pen.lineWidth = 1;
    let free = -Infinity;
    tops.forEach((unit, n) => {
      const y = line(unit.top, [], "#9aa7a3", DEPTHS);
      const next = tops[n + 1]?.top ?? Infinity;
      const shown = y ?? (unit.top < this.view[0] && next > this.view[0] ? top : null);
      if (shown === null || shown < free || Math.min(this.depth.to(next), bottom) - shown < 12) return;
      pen.fillStyle = SOFT; free = this.#unitName(pen, unit.name, shown + 2);
    });
    for (const shoe of casing) {
      const y = line(shoe, [2, 3], "#1b2526", DEPTHS);
      if (y !== null) { pen.fillStyle = INK; pen.beginPath(); pen.moveTo(left - 22, y); pen.lineTo(left - 16, y); pen.lineTo(left - 16, y - 7); pen.fill(); }
    }
    for (const mud of muds.slice(1)) line(mud.top, [6, 4], "#a87200", left - 8);
  }

  /** A formation's name over up to two lines; returns where the next may start. */
  #unitName(pen, name, y) {
    const room = UNITS - 20, [first, ...rest] = name.split(" ");
    pen.fillText(fitText(pen, first, room), DEPTHS + 3, y);
    if (!rest.length) return y + 13;
    pen.fillText(fitText(pen, rest.join(" "), room), DEPTHS + 3, y + 12);
    return y + 25;
  }

  #track(pen, place, n) {
    const { column, left, right } = place, { top, bottom } = this.box;
    place.scale = new Scale(this.domains.get(column.key) ?? column.domain, [left + (column.below ? ARROW_ROOM : 4), right - (column.above ? ARROW_ROOM : 4)], column.log);
    pen.fillStyle = "#fff"; pen.fillRect(left, top, right - left, bottom - top);
    drawX(pen, place.scale, { top, bottom, edge: top, above: true, count: (right - left) / 34, within: [left - 1, right + 1] });
    frame(pen, { left, right, top, bottom });
    pen.textAlign = "center"; pen.textBaseline = "bottom"; pen.fillStyle = INK; pen.font = FONT_STRONG;
    pen.fillText(fitText(pen, column.label, right - left + 3), (left + right) / 2, 16);
    pen.font = FONT; pen.fillStyle = SOFT;
    pen.fillText(fitText(pen, column.computed ? "computed" : column.unit, right - left + 4), (left + right) / 2, 29);
    this.#place(place, n);
  }

  #place({ column, scale }, n) {
    const { middle } = this.model, [low, high] = this.view, zoomed = this.domains.has(column.key);
    for (let row = 0; row < middle.length; row += 1) {
      const depth = middle[row];
      if (!(depth >= low && depth <= high)) continue;
      const [beyond, value] = held(scale.domain, column.value[row]);
      if (value === value && !(beyond && zoomed)) {
        const arrow = beyond ? (beyond < 0 ? ARROWS.left : ARROWS.right) : column.arrow[row];
        this.points.push(scale.to(value), this.depth.to(depth), row, n, lookOf(column.state[row], arrow));
      }
    }
  }

  overlay(pen) {
    if (!this.selection.count) return false;
    this.stamp(pen, this.selection.on);
    return true;
  }

  pick(x, y, event) {
    const hit = this.grid.nearest(x, y);
    if (hit < 0) { if (modeOf(event) === "replace") this.selection.clear(); return; }
    this.selection.apply([this.points.row[hit]], event.shiftKey ? "toggle" : modeOf(event));
  }

  hover(x, y) {
    const hit = x < 0 ? -1 : this.grid.nearest(x, y);
    this.tell(hit < 0 ? null : { row: this.points.row[hit], columns: [this.columns[this.points.column[hit]]], x: this.points.x[hit], y: this.points.y[hit], box: this.surface.box });
  }
}

function depthExtent(model) {
  const [top] = extent(model.top), [, base] = extent(model.base);
  return [top, base];
}

function hatch(pen, x, y, width, height) {
  pen.save(); pen.beginPath(); pen.rect(x, y, width, height); pen.clip();
  pen.strokeStyle = "rgb(255 255 255 / 0.8)"; pen.lineWidth = 1; pen.beginPath();
  for (let at = y - width; at < y + height; at += 5) { pen.moveTo(x, at + width); pen.lineTo(x + width, at); }
  pen.stroke(); pen.restore();
}
