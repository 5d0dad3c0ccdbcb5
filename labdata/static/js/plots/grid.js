// Points on the screen, and a grid over them that finds the nearest without looking at all.

const CELL = 24;

/** Points in typed arrays that grow by doubling: pixels, row of the table, number of the column, look. */
export class Points {
  constructor(room = 256) {
    this.count = 0;
    this.#make(room);
  }

  #make(room) {
    const old = this.x ? [this.x, this.y, this.row, this.column, this.look] : [];
    [this.x, this.y, this.row, this.column, this.look] = [
      new Float32Array(room), new Float32Array(room), new Int32Array(room), new Uint16Array(room), new Uint16Array(room),
    ];
    old.forEach((array, k) => [this.x, this.y, this.row, this.column, this.look][k].set(array));
  }

  push(x, y, row, column, look) {
    if (this.count === this.x.length) this.#make(this.count * 2);
    const i = this.count++;
    this.x[i] = x; this.y[i] = y; this.row[i] = row; this.column[i] = column; this.look[i] = look;
  }
}

export class Grid {
  constructor(points) {
    this.points = points;
    this.cells = new Map();
    for (let i = 0; i < points.count; i += 1) {
      const key = this.#key(points.x[i], points.y[i]);
      const cell = this.cells.get(key);
      if (cell) cell.push(i); else this.cells.set(key, [i]);
    }
  }

  #key(x, y) { return Math.floor(x / CELL) * 65536 + Math.floor(y / CELL); }

  /** Index of the point nearest to (x, y) within `reach` pixels (at most one cell), or -1. */
  nearest(x, y, reach = 9) {
    let best = -1, least = reach * reach;
    for (let dx = -CELL; dx <= CELL; dx += CELL) {
      for (let dy = -CELL; dy <= CELL; dy += CELL) {
        for (const i of this.cells.get(this.#key(x + dx, y + dy)) ?? []) {
          const apart = (this.points.x[i] - x) ** 2 + (this.points.y[i] - y) ** 2;
          if (apart < least || (apart === least && best < 0)) { best = i; least = apart; }
        }
      }
    }
    return best;
  }
}
