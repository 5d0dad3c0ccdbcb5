// One value against another. A point shows the graver state of its two values.

import { FONT, FONT_STRONG, INK, SOFT, drawX, drawY, fitText, frame } from "./axis.js";
import { Grid, Points } from "./grid.js";
import { caught } from "./lasso.js";
import { ARROWS, lookOf } from "./marks.js";
import { Scale, held } from "./scale.js";
import { modeOf } from "./selection.js";

const LEFT = 40, BOTTOM = 32, TOP = 20, RIGHT = 8, ARROW_ROOM = 11;

export class CrossPlot {
  constructor(surface, model, selection, marks, tell) {
    Object.assign(this, { surface, model, selection, marks, tell });
    surface.on({
      ground: (pen) => this.draw(pen),
      points: (pen) => this.stamp(pen, null),
      overlay: (pen) => this.overlay(pen),
      pick: (x, y, event) => this.pick(x, y, event),
      area: (path, event) => selection.apply(caught(this.points, path), modeOf(event)),
      pan: (dx, dy) => this.#pan(dx, dy),
      zoom: (x, y, factor) => this.#zoom(x, y, factor),
      reset: () => this.reset(),
      hover: (x, y) => this.hover(x, y),
    });
    selection.subscribe(() => surface.drawOverlay());
  }

  /** `x`, `y`: columns; `plot`: title, invert_x, invert_y, fits. */
  show(x, y, plot) {
    Object.assign(this, { x, y, plot });
    this.reset();
  }

  reset() {
    if (!this.x || !this.y) return;
    this.viewX = [...this.x.domain]; this.viewY = [...this.y.domain];
    this.surface.redraw();
  }

  #pan(dx, dy) {
    const move = (view, scale, by) => view.map((end) => scale.from(scale.to(end) - by));
    this.viewX = move(this.viewX, this.scaleX, dx); this.viewY = move(this.viewY, this.scaleY, dy);
    this.surface.redraw();
  }

  #zoom(x, y, factor) {
    const about = (view, scale, at) => view.map((end) => scale.from(at + (scale.to(end) - at) * factor));
    this.viewX = about(this.viewX, this.scaleX, x); this.viewY = about(this.viewY, this.scaleY, y);
    this.surface.redraw();
  }

  draw(pen) {
    if (!this.x || !this.y) { this.points = new Points(1); this.grid = new Grid(this.points); return; }
    const { width, height } = this.surface;
    const box = this.box = { left: LEFT, right: width - RIGHT, top: TOP, bottom: height - BOTTOM };
    const across = [box.left + (this.x.below ? ARROW_ROOM : 0), box.right - (this.x.above ? ARROW_ROOM : 0)];
    const up = [box.bottom - (this.y.below ? ARROW_ROOM : 0), box.top + (this.y.above ? ARROW_ROOM : 0)];
    this.scaleX = new Scale(this.viewX, this.plot.invert_x ? across.reverse() : across, this.x.log);
    this.scaleY = new Scale(this.viewY, this.plot.invert_y ? up.reverse() : up, this.y.log);
    pen.fillStyle = "#fff"; pen.fillRect(box.left, box.top, box.right - box.left, box.bottom - box.top);
    drawX(pen, this.scaleX, { ...box, edge: box.bottom, count: (box.right - box.left) / 45 });
    drawY(pen, this.scaleY, { ...box, count: (box.bottom - box.top) / 32 });
    frame(pen, box);
    this.#words(pen);
    this.#place();
    pen.save();
    this.#clip(pen);
    for (const fit of this.plot.fits ?? []) this.#fit(pen, fit);
    pen.restore();
  }

  /** All marks, or those of the rows that are on. */
  stamp(pen, only) {
    if (this.box) this.marks.stampAll(pen, this.points, only);
  }

  #clip(pen) {
    const { left, right, top, bottom } = this.box;
    pen.beginPath(); pen.rect(left - 4, top - 4, right - left + 8, bottom - top + 8); pen.clip();
  }

  #words(pen) {
    const { left, right, bottom } = this.box;
    pen.textBaseline = "bottom"; pen.fillStyle = INK; pen.font = FONT_STRONG; pen.textAlign = "left";
    pen.fillText(fitText(pen, `${this.y.label}${said(this.y)}`, right - left), 4, TOP - 4);
    pen.textAlign = "right";
    pen.fillText(fitText(pen, `${this.x.label}${said(this.x)}`, right - left), right, bottom + 31);
  }

  #place() {
    const { x, y } = this, points = new Points(), [left, right] = ordered(this.viewX), [low, high] = ordered(this.viewY);
    for (let row = 0; row < x.value.length; row += 1) {
      const [across, u] = held(x.domain, x.value[row]), [along, v] = held(y.domain, y.value[row]);
      if (u >= left && u <= right && v >= low && v <= high) {
        points.push(this.scaleX.to(u), this.scaleY.to(v), row, 0, lookOf(Math.max(x.state[row], y.state[row]), this.#arrow(row, across, along)));
      }
    }
    this.points = points;
    this.grid = new Grid(points);
  }

  /** Which way the value lies of a point with a qualifier, or beyond an axis: along y first, turned round with the axis. */
  #arrow(row, beyondX, beyondY) {
    const way = (beyond, arrow) => beyond || (arrow === ARROWS.left ? -1 : arrow === ARROWS.right ? 1 : 0);
    const along = way(beyondY, this.y.arrow[row]), across = way(beyondX, this.x.arrow[row]);
    if (along) return (along < 0) !== Boolean(this.plot.invert_y) ? ARROWS.down : ARROWS.up;
    if (across) return (across < 0) !== Boolean(this.plot.invert_x) ? ARROWS.left : ARROWS.right;
    return ARROWS.none;
  }

  /** A line with its interval: between the lines of the slope's and intercept's ends. */
  #fit(pen, { slope, intercept, interval, span }) {
    const ends = span ?? this.viewX;
    const at = (m, b) => ends.map((x) => [this.scaleX.to(x), this.scaleY.to(m * x + b)]);
    if (interval?.slope && interval?.intercept) {
      const low = at(interval.slope[0], interval.intercept[1]), high = at(interval.slope[1], interval.intercept[0]);
      pen.fillStyle = "rgb(0 114 178 / 0.14)"; pen.beginPath();
      for (const [x, y] of [low[0], low[1], high[1], high[0]]) pen.lineTo(x, y);
      pen.fill();
    }
    pen.strokeStyle = this.model.figures.fit; pen.lineWidth = 1.5; pen.beginPath();
    const [start, end] = [-intercept / slope, Math.max(...ends)];
    for (const x of [start, end]) pen.lineTo(this.scaleX.to(x), this.scaleY.to(slope * x + intercept));
    pen.stroke();
  }

  overlay(pen) {
    if (!this.selection.count || !this.points) return false;
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
    this.tell(hit < 0 ? null : { row: this.points.row[hit], columns: [this.x, this.y], x: this.points.x[hit], y: this.points.y[hit], box: this.surface.box });
  }
}

function ordered([a, b]) { return a < b ? [a, b] : [b, a]; }

function said(column) {
  return `${column.computed ? ", computed" : ""} [${column.unit}]`;
}
