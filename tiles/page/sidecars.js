"use strict";

/* Classes and values of tiles, read from side-car scripts when the pointer comes to a tile.

   A script calls atlasValues("A/U/C/R", TEXT): base64 of a zlib stream of the number of classes (four bytes), the
   classes (two bytes each), the place of each cell's class among them (one byte, or two where there are more than
   256), and for each layer of values three planes, the lowest byte first, of the upper 24 bits of 32-bit floats. */
class SideCars {
  static KEPT = 24; // tiles held in memory
  static CELLS = 65536;
  static texts = new Map(); // what scripts have delivered, by tile

  constructor(layers, across, up, arrived) {
    this.layers = layers;
    this.across = across;
    this.up = up;
    this.arrived = arrived;
    this.held = new Map();
  }

  /** Scripts on their way: at most one. */
  get pending() {
    return [...this.held.values()].filter((tile) => tile.state === "pending").length;
  }

  /** What lies in the middle of a device pixel, counted from the lower left of the plot box: {class, values, state},
      values in the order of the layers of values; null beyond the ends of the axes or without a pair. */
  under(pair, column, row) {
    const [at, to] = [this.across.middleOf(column), this.up.middleOf(row)];
    if (!pair || at < 0n || to < 0n || at >= this.across.full || to >= this.up.full) return null;
    const cells = [this.across.cellAt(pair[0], at), this.up.cellAt(pair[1], to)];
    const tile = this.fetch([...pair, ...cells.map((cell) => cell >> 8n)].join("/"));
    const [x, y] = cells.map((cell) => Number(cell & 255n));
    return tile.state === "ready" ? { state: "ready", ...tile.read(256 * x + y) } : { state: tile.state };
  }

  /** The held tile, asked for when it is new; while another one is on its way, it is asked for when that came. */
  fetch(key) {
    const tile = this.held.get(key) || (this.pending ? { state: "pending" } : this.request(key));
    if (this.held.delete(key)) this.held.set(key, tile); // the most recently used stands last
    return tile;
  }

  request(key) {
    const tile = { state: "pending" };
    const script = document.createElement("script");
    const settle = (state, read) => {
      Object.assign(tile, { state, read });
      script.remove();
      this.arrived();
    };
    script.onload = () => this.unpack(key).then((read) => settle("ready", read), () => settle("unreadable"));
    script.onerror = () => settle("unreadable");
    script.src = `values/${key}.js`;
    document.head.append(script);
    this.held.set(key, tile);
    if (this.held.size > SideCars.KEPT) this.held.delete(this.held.keys().next().value);
    return tile;
  }

  /** A function of the number of a cell that returns its class and values. */
  async unpack(key) {
    const packed = Uint8Array.from(atob(SideCars.texts.get(key)), (sign) => sign.charCodeAt(0));
    SideCars.texts.delete(key);
    const stream = new Blob([packed]).stream().pipeThrough(new DecompressionStream("deflate"));
    const bytes = new DataView(await new Response(stream).arrayBuffer());
    const number = bytes.getUint32(0, true);
    const places = 4 + 2 * number;
    const wide = number > 256 ? 2 : 1;
    const values = places + wide * SideCars.CELLS;
    return (cell) => {
      const place = wide === 2 ? bytes.getUint16(places + 2 * cell, true) : bytes.getUint8(places + cell);
      const part = (layer, k) => bytes.getUint8(values + (3 * layer + k) * SideCars.CELLS + cell);
      const single = new DataView(new ArrayBuffer(4));
      return {
        class: bytes.getUint16(4 + 2 * place, true),
        values: this.layers.valueLayers.map((_, layer) => {
          single.setUint32(0, (part(layer, 2) << 24) | (part(layer, 1) << 16) | (part(layer, 0) << 8));
          return single.getFloat32(0);
        }),
      };
    };
  }
}

window.atlasValues = (key, text) => SideCars.texts.set(key, text);
