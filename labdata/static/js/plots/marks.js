// Markers drawn once into small canvases and stamped from there. A look is a state and an arrow in one number.

export const ARROWS = { none: 0, left: 1, right: 2, down: 3, up: 4 };
const TURN = [0, Math.PI, 0, Math.PI / 2, -Math.PI / 2];

export const lookOf = (state, arrow = 0) => state * 8 + arrow;

const SHAPES = {
  disc(pen, r) { pen.beginPath(); pen.arc(0, 0, r, 0, 7); pen.fill(); },
  ring(pen, r) { pen.beginPath(); pen.arc(0, 0, r - 0.5, 0, 7); pen.save(); pen.fillStyle = "#fff"; pen.fill(); pen.restore(); pen.stroke(); },
  half(pen, r) {
    pen.beginPath(); pen.arc(0, 0, r, 0, 7); pen.save(); pen.fillStyle = "#fff"; pen.fill(); pen.restore(); pen.stroke();
    pen.beginPath(); pen.arc(0, 0, r, Math.PI / 2, -Math.PI / 2); pen.fill();
  },
  triangle(pen, r) { pen.beginPath(); pen.moveTo(0, -r * 1.25); pen.lineTo(r * 1.15, r * 0.85); pen.lineTo(-r * 1.15, r * 0.85); pen.closePath(); pen.fill(); },
  cross(pen, r) { pen.beginPath(); pen.moveTo(-r, -r); pen.lineTo(r, r); pen.moveTo(r, -r); pen.lineTo(-r, r); pen.stroke(); },
  square(pen, r) { pen.strokeRect(-r * 0.75, -r * 0.75, r * 1.5, r * 1.5); },
};

function drawArrow(pen, arrow, r) {
  pen.save();
  pen.rotate(TURN[arrow]);
  pen.beginPath();
  pen.moveTo(r, 0); pen.lineTo(r * 3, 0);
  pen.moveTo(r * 2.1, -r * 0.8); pen.lineTo(r * 3.1, 0); pen.lineTo(r * 2.1, r * 0.8);
  pen.stroke();
  pen.restore();
}

export class Marks {
  /** `states`: names by number; `markers`: name -> {shape, colour}; `halo`: colour of the selected. */
  constructor(states, markers, halo, radius = 3.5, ratio = 1) {
    Object.assign(this, { states, markers, halo, radius, ratio });
    this.half = Math.ceil(radius * 3.4) + 2;
    this.made = new Map();
  }

  #sprite(look, chosen) {
    const key = look * 2 + (chosen ? 1 : 0);
    if (!this.made.has(key)) this.made.set(key, this.#draw(look, chosen));
    return this.made.get(key);
  }

  #draw(look, chosen) {
    const canvas = document.createElement("canvas");
    canvas.width = canvas.height = this.half * 2 * this.ratio;
    const pen = canvas.getContext("2d");
    pen.scale(this.ratio, this.ratio);
    pen.translate(this.half, this.half);
    const { shape, colour } = this.markers[this.states[look >> 3]];
    if (chosen) { pen.strokeStyle = this.halo; pen.lineWidth = 1.75; pen.beginPath(); pen.arc(0, 0, this.radius + 2.25, 0, 7); pen.stroke(); }
    pen.strokeStyle = pen.fillStyle = colour;
    pen.lineWidth = shape === "cross" ? 1.1 : 1.3;
    const arrow = look & 7;
    SHAPES[shape](pen, arrow ? this.radius * 0.8 : this.radius);
    if (arrow) drawArrow(pen, arrow, this.radius);
    return canvas;
  }

  /** Stamp one mark at (x, y). */
  stamp(pen, look, x, y, chosen = false) {
    pen.drawImage(this.#sprite(look, chosen), x - this.half, y - this.half, this.half * 2, this.half * 2);
  }

  /** Stamp all points, or only those whose row is on. */
  stampAll(pen, points, only = null) {
    for (let i = 0; i < points.count; i += 1) {
      if (!only || only[points.row[i]]) this.stamp(pen, points.look[i], points.x[i], points.y[i], only !== null);
    }
  }
}
