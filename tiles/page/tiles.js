"use strict";

/* Which tiles exist, which pair of levels is shown, and laying the tiles out on device pixels. */
class Tiles {
  static KEPT = 320; // tiles held in memory

  constructor(meta, layers, across, up, arrived) {
    this.layers = layers;
    this.present = meta.present;
    this.pairs = [...meta.pairs].sort(([a, u], [b, v]) => b + v - a - u || b - a);
    this.across = across;
    this.up = up;
    this.arrived = arrived;
    this.runs = new Map();
    this.held = new Map();
    this.wanted = new Set();
  }

  isBuilt(a, u) {
    return this.pairs.some(([b, v]) => a === b && u === v);
  }

  /** The pair of levels to show: {asked, pair, kind}.

      kind is "exact", "shrunk", "stretched" or, with pair null, "none". At whole levels a pair that was not built
      is replaced by the nearest coarser one, stretched. Between whole levels the next finer pair is shrunk, by
      less than two levels of an axis, and only where there is none a coarser one stretched. */
  choose() {
    const levels = [this.across.level, this.up.level];
    const asked = levels.map((level) => Math.max(0, Math.ceil(level)));
    const sharp = levels.every((level, k) => level === asked[k]);
    if (this.isBuilt(...asked)) return { asked, pair: asked, kind: sharp ? "exact" : "shrunk" };
    const shrinkable = (level, k) => level >= asked[k] && level - levels[k] < 2;
    const finer = this.pairs.filter((pair) => pair.every(shrinkable)).pop();
    const coarser = this.pairs.find((pair) => pair.every((level, k) => level <= asked[k]));
    if (finer && !(sharp && coarser)) return { asked, pair: finer, kind: "shrunk" };
    return { asked, pair: coarser || null, kind: coarser ? "stretched" : "none" };
  }

  /** The built pair nearest to the present zoom. */
  nearestPair() {
    const away = ([a, u]) => Math.abs(a - this.across.level) + Math.abs(u - this.up.level);
    return this.pairs.reduce((best, pair) => (away(pair) < away(best) ? pair : best));
  }

  /** Whether a tile is not empty; an empty one has no file. */
  has(a, u, column, row) {
    const key = `${a}/${u}/${column}`;
    if (!this.runs.has(key)) this.runs.set(key, parseRuns(this.present[`${a}/${u}`]?.[column]));
    return this.runs.get(key).some(([first, last]) => first <= row && row <= last);
  }

  /** Tiles on their way. */
  get pending() {
    return [...this.held.values()].filter((tile) => tile.state === "pending").length;
  }

  get unreadable() {
    return [...this.wanted].filter((key) => this.held.get(key)?.state === "unreadable").length;
  }

  /** Draw the visible tiles of the chosen pair into a plot box {left, top, width, height}. */
  draw(context, plot) {
    const { pair, kind } = this.choose();
    this.wanted.clear();
    const [a, u] = pair || [0, 0];
    const smooth = kind === "shrunk" && this.layers.shown.kind !== "classes"; // colours of classes never mix
    if (!pair) return this.forget();
    for (const column of indices(this.across.tilesAt(a))) {
      for (const row of indices(this.up.tilesAt(u))) {
        if (!this.has(a, u, column, row)) continue;
        const tile = this.fetch(a, u, column, row);
        if (tile.state === "ready") {
          context.imageSmoothingEnabled = smooth;
          const image = smooth ? halved(tile, this.across.halvings(a), this.up.halvings(u)) : tile.image;
          this.place(context, plot, image, this.across.pieces(a, column), this.up.pieces(u, row));
        } else {
          this.standIn(context, plot, a, u, column, row);
        }
      }
    }
    this.forget();
  }

  /** Draw pieces of an image that shows a whole tile, perhaps in fewer than 256 pixels. */
  place(context, plot, image, acrossPieces, upPieces) {
    const [columnSize, rowSize] = [image.width / 256, image.height / 256];
    for (const [x, columns, left, right] of acrossPieces) {
      for (const [y, rows, low, high] of upPieces) {
        context.drawImage(
          image, x * columnSize, (256 - y - rows) * rowSize, columns * columnSize, rows * rowSize,
          plot.left + left, plot.top + plot.height - high, right - left, high - low,
        );
      }
    }
  }

  /** Until a tile arrives, show its part of a coarser one that is already there. */
  standIn(context, plot, a, u, column, row) {
    for (const [b, v] of this.pairs) {
      if (b > a || v > u || a - b > 8 || u - v > 8) continue;
      const parent = this.held.get(this.url(b, v, column >> BigInt(a - b), row >> BigInt(u - v)));
      if (parent?.state !== "ready") continue;
      const part = (axis, level, index, up) => {
        const size = 256 >> up;
        const from = Number(index % (1n << BigInt(up))) * size;
        return [[from, size, axis.edge(level, index), axis.edge(level, index + 1n)]];
      };
      context.imageSmoothingEnabled = false;
      this.place(context, plot, parent.image, part(this.across, a, column, a - b), part(this.up, u, row, u - v));
      return;
    }
  }

  url(a, u, column, row) {
    return `tiles/${this.layers.shown.name}/${a}/${u}/${column}/${row}.png`;
  }

  /** The held tile of an address, asked for when it is new: {image, state}. */
  fetch(a, u, column, row) {
    const url = this.url(a, u, column, row);
    const tile = this.held.get(url) || this.request(url);
    this.wanted.add(url);
    this.held.delete(url);
    this.held.set(url, tile); // the most recently used stands last
    return tile;
  }

  request(url) {
    const tile = { image: new Image(), state: "pending" };
    const settle = (state) => () => {
      tile.state = state;
      this.arrived();
    };
    tile.image.onload = settle("ready");
    tile.image.onerror = settle("unreadable");
    tile.image.src = url;
    return tile;
  }

  /** Stop requests of tiles that left the window and drop the tiles not seen for longest. */
  forget() {
    for (const [url, tile] of this.held) {
      if (this.wanted.has(url)) continue;
      if (tile.state !== "pending" && this.held.size <= Tiles.KEPT) continue;
      tile.image.onload = tile.image.onerror = null;
      if (tile.state === "pending") tile.image.src = "";
      this.held.delete(url);
    }
  }
}

/** A tile's image with its columns and rows averaged in pairs, so that a further shrinking, to more than half,
    takes a share of every pixel and leaves no gaps in a thin branch. */
function halved(tile, across, up) {
  if (!across && !up) return tile.image;
  const [width, height] = [256 >> across, 256 >> up];
  if (tile.halved?.width === width && tile.halved?.height === height) return tile.halved;
  const finer = across ? halved(tile, across - 1, up) : halved(tile, 0, up - 1);
  tile.halved = Object.assign(document.createElement("canvas"), { width, height });
  tile.halved.getContext("2d").drawImage(finer, 0, 0, width, height);
  return tile.halved;
}

/** "3-5,9" as [[3n, 5n], [9n, 9n]]; nothing as []. */
function parseRuns(text) {
  if (!text) return [];
  return text.split(",").map((run) => {
    const [first, last] = run.split("-");
    return [BigInt(first), BigInt(last ?? first)];
  });
}

function* indices([first, last]) {
  for (let index = first; index <= last; index += 1n) yield index;
}
