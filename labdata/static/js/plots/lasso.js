// What lies inside a path drawn on the screen.

/** Whether (x, y) lies inside the closed `path` of [x, y, x, y, …]: even-odd rule. */
export function inside(path, x, y) {
  let within = false;
  const n = path.length;
  for (let i = 0, j = n - 2; i < n; j = i, i += 2) {
    const xi = path[i], yi = path[i + 1], xj = path[j], yj = path[j + 1];
    if (yi > y !== yj > y && x < ((xj - xi) * (y - yi)) / (yj - yi) + xi) within = !within;
  }
  return within;
}

/** The corners of a rectangle as a path. */
export function rectangle(x0, y0, x1, y1) {
  return [x0, y0, x1, y0, x1, y1, x0, y1];
}

/** Rows of the points inside the path, each once. `points` has x, y (pixels) and row. */
export function caught(points, path) {
  let left = Infinity, right = -Infinity, top = Infinity, bottom = -Infinity;
  for (let i = 0; i < path.length; i += 2) {
    left = Math.min(left, path[i]); right = Math.max(right, path[i]);
    top = Math.min(top, path[i + 1]); bottom = Math.max(bottom, path[i + 1]);
  }
  const found = new Set();
  for (let i = 0; i < points.count; i += 1) {
    const x = points.x[i], y = points.y[i];
    if (x >= left && x <= right && y >= top && y <= bottom && inside(path, x, y)) found.add(points.row[i]);
  }
  return found;
}
