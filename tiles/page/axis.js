"use strict";

/* What one axis of the view shows, in exact integers.

   The whole axis is 2^bits units long. `centre` is the unit in the middle of the window, `zoom` the level in
   steps of 1/64. At a whole level one device pixel is one tile pixel; in between, the size of a device pixel is
   the nearest multiple of a 512th, so it stays a whole number of units at every zoom and each step can be undone. */

const STEPS_PER_LEVEL = 64;
const LEVELS_BEYOND = 20; // how far past the deepest built level one may zoom
const SCALE_BITS = 10n;
const SCALES = Array.from({ length: STEPS_PER_LEVEL }, (_, step) =>
  2n * BigInt(Math.round(512 * 2 ** (-step / STEPS_PER_LEVEL))));
const ADDRESS = /^(-?\d{1,6}(?:\.\d{1,6})?),([01])(?:\.([0-9a-f]{1,999}))?$/;
const FAR = 1n << 30n; // pixels beyond this are all equally far outside the window

class Axis {
  constructor(meta, deepest) {
    Object.assign(this, { name: meta.name, label: meta.label, measure: meta.unit, ofPi: Boolean(meta.of_pi) });
    this.low = exact.parse(meta.low);
    this.high = exact.parse(meta.high);
    this.width = exact.subtract(this.high, this.low);
    this.finest = deepest + LEVELS_BEYOND;
    this.bits = BigInt(this.finest + 8) + SCALE_BITS;
    this.full = 1n << this.bits;
    this.precision = this.bits + 64n;
    this.logarithm = meta.scale === "log" ? exact.ln(exact.divide(this.high, this.low), this.precision) : null;
    this.pixels = 1;
    this.showWhole();
  }

  /** Units in one device pixel. */
  unit(zoom = this.zoom) {
    const level = Math.floor(zoom / STEPS_PER_LEVEL);
    return SCALES[zoom - level * STEPS_PER_LEVEL] << BigInt(this.finest - level);
  }

  get level() {
    return this.zoom / STEPS_PER_LEVEL;
  }

  /** Unit at the lower edge of the window: a multiple of the pixel size, so tiles fall on whole pixels. */
  start() {
    const unit = this.unit();
    return exact.roundDiv(2n * this.centre - BigInt(this.pixels) * unit, 2n * unit) * unit;
  }

  end() {
    return this.start() + BigInt(this.pixels) * this.unit();
  }

  /** The window's part of the axis, in units. */
  window() {
    return [this.start(), this.end()].map((at) => this.clip(at));
  }

  clip(at) {
    return at < 0n ? 0n : at > this.full ? this.full : at;
  }

  /** Device pixels from the lower edge of the window to a position. */
  pixelOf(at) {
    const pixel = exact.roundDiv(at - this.start(), this.unit());
    return Number(pixel > FAR ? FAR : pixel < -FAR ? -FAR : pixel);
  }

  /** Position in the middle of a device pixel. */
  middleOf(pixel) {
    const unit = this.unit();
    return this.start() + BigInt(pixel) * unit + unit / 2n;
  }

  fit(pixels = this.pixels) {
    let zoom = Math.ceil(STEPS_PER_LEVEL * Math.log2(pixels / 256)) + 1;
    while (BigInt(pixels) * this.unit(zoom) < this.full) zoom -= 1;
    return zoom;
  }

  showWhole() {
    this.zoom = this.fit();
    this.centre = this.full / 2n;
  }

  showsWhole() {
    return this.zoom === this.fit() && this.centre === this.full / 2n;
  }

  resize(pixels) {
    const whole = this.showsWhole();
    this.pixels = pixels;
    if (whole) this.showWhole();
    else this.zoom = this.allowed(this.zoom);
  }

  allowed(zoom) {
    const least = Math.min(0, this.fit() - STEPS_PER_LEVEL);
    return Math.max(least, Math.min(zoom, this.finest * STEPS_PER_LEVEL));
  }

  moveBy(pixels) {
    this.centre = this.clip(this.centre + BigInt(pixels) * this.unit());
  }

  /** Zoom by steps; what lies `pixel` device pixels from the lower edge stays there. */
  zoomBy(steps, pixel = this.pixels / 2) {
    const before = this.unit();
    this.zoom = this.allowed(this.zoom + steps);
    const twice = BigInt(Math.round(2 * pixel) - this.pixels);
    this.centre = this.clip(this.centre + (twice * (before - this.unit())) / 2n);
  }

  /** `zoom,centre` for a link: the level and a hexadecimal share of the whole axis, both exact. */
  address() {
    const padding = (4n - (this.bits % 4n)) % 4n;
    const digits = (this.centre << padding).toString(16).padStart(Number((this.bits + padding) / 4n) + 1, "0");
    return `${this.level},${`${digits[0]}.${digits.slice(1)}`.replace(/\.?0+$/, "")}`;
  }

  static isAddress(text) {
    return ADDRESS.test(text);
  }

  follow(address) {
    const [, level, whole, digits = ""] = ADDRESS.exec(address);
    this.centre = this.clip((BigInt(`0x${whole}${digits}`) << this.bits) >> BigInt(4 * digits.length));
    this.zoom = this.allowed(Math.round(Number(level) * STEPS_PER_LEVEL));
  }

  /** Value at a position: exact on a linear axis, to some 64 bits below one unit on a logarithmic one. */
  valueAt(at) {
    if (at === 0n) return this.low;
    if (at === this.full) return this.high;
    if (this.logarithm === null) return exact.add(this.low, exact.scale(this.width, at, this.full));
    return exact.multiply(this.low, exact.exp((this.logarithm * at) >> this.bits, this.precision));
  }

  positionOf(value) {
    const above = exact.subtract(value, this.low);
    const { num, den } = this.width;
    if (this.logarithm === null) return exact.roundDiv(above.num * den * this.full, above.den * num);
    return exact.roundDiv(exact.ln(exact.divide(value, this.low), this.precision) << this.bits, this.logarithm);
  }

  /** Size of one device pixel at a position, in the axis' own units. */
  stepAt(at) {
    if (this.logarithm === null) return exact.scale(this.width, this.unit(), this.full);
    return exact.scale(this.valueAt(at), this.logarithm * this.unit(), this.full << this.precision);
  }

  /** Value in the middle of a device pixel, to a tenth of the pixel. */
  readout(pixel) {
    const at = this.clip(this.middleOf(pixel));
    const tenth = exact.scale(this.stepAt(at), 1n, 10n);
    return exact.decimal(this.valueAt(at), exact.placesFor(tenth)) + (this.ofPi ? "π" : "");
  }

  /** Value at a position as a config writes it: to a thousandth of a pixel, exact where that is as short. */
  written(at) {
    const value = this.valueAt(at);
    const rounded = exact.decimal(value, exact.placesFor(exact.scale(this.stepAt(at), 1n, 1000n)));
    const short = rounded.includes(".") ? rounded.replace(/\.?0+$/, "") : rounded;
    const end = at === 0n || at === this.full;
    if (!this.ofPi) {
      const text = end || this.logarithm === null ? exact.text(value) : short;
      return end || text.length <= short.length ? text : short;
    }
    const { num, den } = exact.reduce(value);
    if (num === 0n || Number(short) === 0) return "0";
    const text = den === 1n ? `${num}*pi` : `${num}*pi/${den}`;
    return end || text.length <= short.length + 3 ? text : `${short}*pi`;
  }

  /** The tile or tile-pixel edges of a level as device pixels. */
  edge(level, index) {
    return this.pixelOf(index << (this.bits - BigInt(level)));
  }

  /** Number of the tile pixel of a level that holds a position. */
  cellAt(level, at) {
    return at >> (this.bits - BigInt(level + 8));
  }

  /** First and last index of the tiles of a level that lie in the window. */
  tilesAt(level) {
    const size = 1n << (this.bits - BigInt(level));
    const [from, to] = this.window();
    return [from / size, exact.ceilDiv(to, size) - 1n];
  }

  /** How often the pixels of a level are to be averaged in pairs to come within a factor 2 of the window's. */
  halvings(level) {
    return Math.max(0, Math.floor(level - this.level));
  }

  /** Pieces [first tile pixel, number of them, from, to] that lay one tile out on device pixels from … to. */
  pieces(level, index) {
    const fine = level + 8;
    const first = index << 8n;
    const edge = (pixel) => this.edge(fine, first + BigInt(pixel));
    const stretch = 2 ** (this.level - level);
    if (stretch <= 1) return [[0, 256, edge(0), edge(256)]];
    const size = 1n << (this.bits - BigInt(fine));
    const [start, end] = this.window();
    const from = Math.max(0, Number(start / size - first));
    const to = Math.min(256, Number(exact.ceilDiv(end, size) - first));
    if (stretch < 32) return [[from, to - from, edge(from), edge(to)]];
    const near = (pixel) => Math.max(-1, Math.min(edge(pixel), this.pixels + 1));
    return Array.from({ length: to - from }, (_, k) => [from + k, 1, near(from + k), near(from + k + 1)]);
  }
}
