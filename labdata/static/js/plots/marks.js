// Markers drawn once and stamped from there, pixel by pixel. A look is a state and an arrow in one number.

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

/** A marker as the list of its inked pixels: place in an image `width` wide beside the middle, colour, firmness. */
function pixels(canvas, half, width) {
  const { width: across, data } = canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height);
  const place = [], colour = [], firm = [];
  for (let at = 0; at < data.length; at += 4) {
    if (data[at + 3] < 8) continue;
    place.push((Math.floor((at >> 2) / across) - half) * width + ((at >> 2) % across) - half);
    colour.push(((data[at + 3] << 24) | (data[at + 2] << 16) | (data[at + 1] << 8) | data[at]) >>> 0);
    firm.push(data[at + 3] > 127 ? 1 : 0);
  }
  return { place: Int32Array.from(place), colour: Uint32Array.from(colour), firm: Uint8Array.from(firm) };
}

export class Marks {
  /** `states`: names by number; `markers`: name -> {shape, colour}; `halo`: colour of the selected. */
  constructor(states, markers, halo, radius = 3.5, ratio = 1) {
    Object.assign(this, { states, markers, halo, radius, ratio });
    this.half = (Math.ceil(radius * 3.4) + 2) * ratio;
    this.made = new Map();
  }

  #sprite(look, chosen, width) {
    const key = (width * 256 + look) * 2 + (chosen ? 1 : 0);
    let sprite = this.made.get(key);
    if (!sprite) { sprite = pixels(this.#draw(look, chosen), this.half, width); this.made.set(key, sprite); }
    return sprite;
  }

  #draw(look, chosen) {
    const canvas = document.createElement("canvas");
    canvas.width = canvas.height = this.half * 2;
    const pen = canvas.getContext("2d", { willReadFrequently: true });
    pen.translate(this.half, this.half);
    pen.scale(this.ratio, this.ratio);
    const { shape, colour } = this.markers[this.states[look >> 3]];
    if (chosen) { pen.strokeStyle = this.halo; pen.lineWidth = 1.75; pen.beginPath(); pen.arc(0, 0, this.radius + 2.25, 0, 7); pen.stroke(); }
    pen.strokeStyle = pen.fillStyle = colour;
    pen.lineWidth = shape === "cross" ? 1.1 : 1.3;
    const arrow = look & 7;
    SHAPES[shape](pen, arrow ? this.radius * 0.8 : this.radius);
    if (arrow) drawArrow(pen, arrow, this.radius);
    return canvas;
  }

  /**
   * Stamp all points, or only those whose row is on, ringed. The canvas is replaced: it holds marks and nothing else.
   * Pixels are written straight into one image, which is many times quicker than drawing each mark.
   */
  stampAll(pen, points, only = null) {
    const { half, ratio } = this, { width, height } = pen.canvas, across = width + 2 * half; // a margin for marks at the edge
    const image = new ImageData(across, height + 2 * half), ink = new Uint32Array(image.data.buffer);
    for (let i = 0; i < points.count; i += 1) {
      if (only && !only[points.row[i]]) continue;
      const x = Math.round(points.x[i] * ratio), y = Math.round(points.y[i] * ratio);
      if (x < 0 || y < 0 || x >= width || y >= height) continue;
      stamp(ink, this.#sprite(points.look[i], only !== null, across), (y + half) * across + x + half);
    }
    pen.putImageData(image, -half, -half);
  }
}

function stamp(ink, { place, colour, firm }, middle) {
  for (let n = 0; n < place.length; n += 1) {
    const at = middle + place[n];
    if (firm[n] || ink[at] === 0) ink[at] = colour[n]; // soft edges only on bare paper: blending costs too much
  }
}
