// Three canvases one over the other, and the gestures made on them. Ground (axes, bands) and points are drawn when data
// or view change, the overlay when the selection does; while something is selected a class dims the points.

import { rectangle } from "./lasso.js";

const CLICK = 4; // pixels a pointer may move and still have clicked

export class Surface {
  /** `tools.current`: "pick", "rect", "lasso" or "pan". */
  constructor(box, tools) {
    this.box = box;
    this.tools = tools;
    this.ratio = window.devicePixelRatio || 1;
    this.ground = this.#canvas("plot-ground");
    this.points = this.#canvas("plot-points");
    this.overlay = this.#canvas("plot-overlay");
    this.trail = null;
    this.handlers = {};
    this.#listen();
    new ResizeObserver(() => this.#resize()).observe(box);
  }

  /** Handlers: ground(pen), points(pen), overlay(pen) -> whether anything is selected, pick(x, y, event), area(path, event), pan(dx, dy), zoom(x, y, factor), hover(x, y). */
  on(handlers) { Object.assign(this.handlers, handlers); this.#resize(); }

  #canvas(name) {
    const canvas = document.createElement("canvas");
    canvas.className = name;
    canvas.setAttribute("aria-hidden", "true");
    this.box.append(canvas);
    return canvas;
  }

  #resize() {
    const width = Math.floor(this.box.clientWidth), height = Math.floor(this.box.clientHeight);
    if (!width || !height || !this.handlers.ground) return;
    this.width = width; this.height = height;
    for (const canvas of [this.ground, this.points, this.overlay]) {
      canvas.width = width * this.ratio; canvas.height = height * this.ratio;
      canvas.style.width = `${width}px`; canvas.style.height = `${height}px`;
    }
    this.redraw();
  }

  /** A cleared pen in CSS pixels on one of the canvases. */
  pen(canvas) {
    const pen = canvas.getContext("2d");
    pen.setTransform(this.ratio, 0, 0, this.ratio, 0, 0);
    pen.clearRect(0, 0, this.width, this.height);
    return pen;
  }

  redraw() {
    if (!this.width) return;
    this.handlers.ground(this.pen(this.ground));
    this.handlers.points(this.pen(this.points));
    this.drawOverlay();
  }

  drawOverlay() {
    if (!this.width) return;
    const pen = this.pen(this.overlay);
    this.points.classList.toggle("dimmed", this.handlers.overlay(pen));
    if (this.trail) this.#drawTrail(pen);
  }

  #drawTrail(pen) {
    const path = this.#path();
    pen.beginPath();
    for (let i = 0; i < path.length; i += 2) pen.lineTo(path[i], path[i + 1]);
    pen.closePath();
    pen.fillStyle = "rgb(0 114 178 / 0.10)"; pen.fill();
    pen.strokeStyle = "#0072b2"; pen.lineWidth = 1.25; pen.setLineDash([4, 3]); pen.stroke(); pen.setLineDash([]);
  }

  #path() {
    const trail = this.trail;
    if (this.tools.current === "lasso") return trail;
    return rectangle(trail[0], trail[1], trail.at(-2), trail.at(-1));
  }

  #at(event) {
    const box = this.box.getBoundingClientRect();
    return [event.clientX - box.left - this.box.clientLeft, event.clientY - box.top - this.box.clientTop];
  }

  #listen() {
    const box = this.box;
    box.addEventListener("pointerdown", (event) => {
      if (event.button !== 0) return;
      box.setPointerCapture(event.pointerId);
      this.start = this.last = this.#at(event);
      if (this.tools.current === "lasso" || this.tools.current === "rect") this.trail = [...this.start];
      event.preventDefault();
    });
    box.addEventListener("pointermove", (event) => this.#move(event));
    box.addEventListener("pointerup", (event) => this.#end(event));
    box.addEventListener("pointercancel", () => { this.start = this.trail = null; this.drawOverlay(); });
    box.addEventListener("pointerleave", () => this.handlers.hover?.(-1, -1));
    box.addEventListener("wheel", (event) => {
      event.preventDefault();
      const turn = event.deltaY || event.deltaX; // with Shift some systems turn the wheel sideways
      this.handlers.zoom?.(...this.#at(event), Math.exp(Math.sign(turn) * Math.min(0.25, Math.abs(turn) / 400)), event);
    }, { passive: false });
    box.addEventListener("dblclick", () => this.handlers.reset?.());
  }

  #move(event) {
    const [x, y] = this.#at(event);
    if (!this.start) { this.handlers.hover?.(x, y); return; }
    if (this.tools.current === "pan") this.handlers.pan?.(x - this.last[0], y - this.last[1]);
    else if (this.trail) { this.trail.push(x, y); this.drawOverlay(); }
    this.last = [x, y];
  }

  #end(event) {
    if (!this.start) return;
    const [x, y] = this.#at(event), [x0, y0] = this.start;
    const far = Math.hypot(x - x0, y - y0) > CLICK || (this.trail?.length ?? 0) > 16;
    const path = this.trail && far ? this.#path() : null;
    this.start = this.trail = null;
    if (path) this.handlers.area?.(path, event);
    else if (!far) this.handlers.pick?.(x, y, event);
    this.drawOverlay();
  }
}
