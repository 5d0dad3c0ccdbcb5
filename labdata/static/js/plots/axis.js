// Axes and their words, drawn on a canvas.

import { tickText } from "./scale.js";

export const INK = "#1b2526";
export const SOFT = "#4a5859";
export const LINE = "#dbe2df";
export const FONT = '11px system-ui, "Segoe UI", "Noto Sans", "Liberation Sans", Arial, sans-serif';
export const FONT_STRONG = `600 ${FONT}`;

/** Text of which the start is kept when it is too wide. */
export function fitText(pen, text, width) {
  if (pen.measureText(text).width <= width) return text;
  let kept = text;
  while (kept.length > 1 && pen.measureText(`${kept}…`).width > width) kept = kept.slice(0, -1);
  return `${kept}…`;
}

/** Ticks that do not touch each other: every one, every second, … */
export function thinned(pen, scale, ticks, gap = 6) {
  for (let every = 1; every <= ticks.length; every += 1) {
    const kept = ticks.filter((_, n) => n % every === 0);
    let end = -Infinity;
    const boxes = kept.map((tick) => [scale.to(tick), pen.measureText(tickText(tick)).width / 2]).sort((a, b) => a[0] - b[0]);
    if (boxes.every(([at, half]) => { const free = at - half > end + gap; end = at + half; return free; })) return kept;
  }
  return ticks.slice(0, 1);
}

/** Grid lines and tick words along x. `edge` is where the words stand, `above` whether over it. */
export function drawX(pen, scale, { top, bottom, edge, above = false, count = 4, within = null }) {
  pen.font = FONT;
  const ticks = scale.ticks(count);
  pen.strokeStyle = LINE; pen.lineWidth = 1; pen.beginPath();
  for (const tick of ticks) { const x = Math.round(scale.to(tick)) + 0.5; pen.moveTo(x, top); pen.lineTo(x, bottom); }
  pen.stroke();
  pen.fillStyle = SOFT; pen.textAlign = "center"; pen.textBaseline = above ? "bottom" : "top";
  for (const tick of thinned(pen, scale, ticks)) {
    const half = pen.measureText(tickText(tick)).width / 2;
    const at = within ? Math.min(within[1] - half, Math.max(within[0] + half, scale.to(tick))) : scale.to(tick);
    pen.fillText(tickText(tick), at, above ? edge - 2 : edge + 3);
  }
}

/** Grid lines and tick words along y, the words left of `left`. */
export function drawY(pen, scale, { left, right, count = 5 }) {
  pen.font = FONT; pen.strokeStyle = LINE; pen.lineWidth = 1; pen.beginPath();
  const ticks = scale.ticks(count);
  for (const tick of ticks) { const y = Math.round(scale.to(tick)) + 0.5; pen.moveTo(left, y); pen.lineTo(right, y); }
  pen.stroke();
  pen.fillStyle = SOFT; pen.textAlign = "right"; pen.textBaseline = "middle";
  for (const tick of ticks) pen.fillText(tickText(tick), left - 4, scale.to(tick));
}

/** A frame around a plot. */
export function frame(pen, box) {
  pen.strokeStyle = "#74827f"; pen.lineWidth = 1;
  pen.strokeRect(Math.round(box.left) + 0.5, Math.round(box.top) + 0.5, Math.round(box.right - box.left), Math.round(box.bottom - box.top));
}
