"use strict";

/* What stands around the tiles on the canvas: frame, ticks, names of the axes, marks of unsettled columns.

   All lengths are device pixels, so that a tile pixel can be one of them; css() turns CSS pixels into them. */

const COLOURS = { ground: "#f7f6f2", outside: "#e7e5de", ink: "#1d2126", quiet: "#565c63", mark: "#b3461e" };
const FONTS = { words: 'system-ui, "DejaVu Sans", sans-serif', symbol: 'Georgia, "DejaVu Serif", serif' };

class Frame {
  constructor(canvas, across, up, marks) {
    this.canvas = canvas;
    this.context = canvas.getContext("2d", { alpha: false });
    this.across = across;
    this.up = up;
    this.marks = Object.entries(marks || {}).map(([level, runs]) => [Number(level), parseRuns(runs)]);
    this.plot = { left: 0, top: 0, width: 0, height: 0 }; // the box that the tiles fill
    this.ratio = 1; // device pixels in a CSS pixel
  }

  css(length) {
    return Math.max(1, Math.round(length * this.ratio));
  }

  /** Fill the canvas' parent, on whole device pixels, and lay out the plot box. */
  resize() {
    const box = this.canvas.parentElement.getBoundingClientRect();
    this.ratio = window.devicePixelRatio;
    const [x, y] = [box.left, box.top].map((edge) => alignedFrom(edge, this.ratio));
    const [wide, high] = [alignedTo(box.right - x, this.ratio), alignedTo(box.bottom - y, this.ratio)];
    const style = { left: x - box.left, top: y - box.top, width: wide, height: high };
    for (const [side, length] of Object.entries(style)) this.canvas.style[side] = `${length}px`;
    const [width, height] = [wide, high].map((length) => Math.max(1, Math.round(length * this.ratio)));
    Object.assign(this.canvas, { width, height });
    const [left, right] = wide < 600 ? [this.css(60), this.css(12)] : [this.css(68), this.css(24)];
    const [top, bottom] = [this.css(30), this.css(44)];
    this.plot = { left, top, width: Math.max(1, width - left - right), height: Math.max(1, height - top - bottom) };
    this.across.resize(this.plot.width);
    this.up.resize(this.plot.height);
  }

  fill(colour, x, y, width, height) {
    this.context.fillStyle = colour;
    this.context.fillRect(x, y, width, height);
  }

  /** The ground, the background of the view's own area and, clipped to the plot box, what `inside` draws. */
  drawInside(background, inside) {
    const { left, top, width, height } = this.plot;
    const { context, across, up } = this;
    this.fill(COLOURS.ground, 0, 0, this.canvas.width, this.canvas.height);
    context.save();
    context.beginPath();
    context.rect(left, top, width, height);
    context.clip();
    this.fill(COLOURS.outside, left, top, width, height);
    const [west, east] = across.window().map((at) => across.pixelOf(at));
    const [south, north] = up.window().map((at) => up.pixelOf(at));
    this.fill(background, left + west, top + height - north, east - west, north - south);
    inside(context, this.plot);
    context.restore();
  }

  drawAround() {
    this.drawFrame();
    this.drawAcrossTicks();
    this.drawUpTicks();
    this.drawMarks();
  }

  drawFrame() {
    const { left, top, width, height } = this.plot;
    const line = this.css(1);
    this.fill(COLOURS.ink, left - line, top - line, width + 2 * line, line);
    this.fill(COLOURS.ink, left - line, top + height, width + 2 * line, line);
    this.fill(COLOURS.ink, left - line, top, line, height);
    this.fill(COLOURS.ink, left + width, top, line, height);
  }

  /** Columns with an unsettled share: marks above and below the frame. */
  drawMarks() {
    const { left, top, width, height } = this.plot;
    const [thick, gap] = [this.css(4), this.css(2)];
    for (const [level, runs] of this.marks) {
      let drawn = -1;
      for (const [first, last] of runs) {
        const from = Math.max(0, this.across.edge(level + 8, first));
        const to = Math.min(width, Math.max(this.across.edge(level + 8, last + 1n), from + this.css(1)));
        if (from >= width) break;
        if (to <= drawn) continue;
        this.fill(COLOURS.mark, left + from, top - gap - thick, to - from, thick);
        this.fill(COLOURS.mark, left + from, top + height + gap, to - from, thick);
        drawn = to;
      }
    }
  }

  drawAcrossTicks() {
    const { left, top, width, height } = this.plot;
    const foot = top + height + this.css(1);
    const fits = spacer(this.css(10));
    const { major, minor, offset } = ticks.of(this.across, Math.max(2, Math.floor(width / this.css(96))));
    for (const pixel of minor) this.fill(COLOURS.quiet, left + pixel, foot, this.css(1), this.css(4));
    for (const { pixel, text } of major) {
      this.fill(COLOURS.ink, left + pixel, foot, this.css(1), this.css(8));
      const half = this.measure(text) / 2;
      if (fits(pixel - half, pixel + half)) this.write(text, left + pixel, foot + this.css(21), "center");
    }
    this.writeName(this.across, offset, left + width, foot + this.css(38), "right");
  }

  drawUpTicks() {
    const { left, top, height } = this.plot;
    const side = left - this.css(1);
    const line = (pixel) => top + height - 1 - pixel;
    const fits = spacer(this.css(4));
    const { major, minor, offset } = ticks.of(this.up, Math.max(2, Math.floor(height / this.css(48))));
    for (const pixel of minor) this.fill(COLOURS.quiet, side - this.css(4), line(pixel), this.css(4), this.css(1));
    for (const { pixel, text } of major) {
      this.fill(COLOURS.ink, side - this.css(8), line(pixel), this.css(8), this.css(1));
      if (fits(pixel, pixel + this.css(12))) this.write(text, side - this.css(11), line(pixel) + this.css(4), "right");
    }
    this.writeName(this.up, offset, this.css(10), this.css(17), "left");
  }

  /** The axis' label, symbol and unit and, at depth, the number that the tick labels are added to. */
  writeName(axis, offset, x, y, align) {
    const words = axis.label && axis.label !== axis.name ? `${axis.label} ` : "";
    const rest = (axis.measure ? ` (${axis.measure})` : "") + (offset ? ` = ${offset}` : "");
    const pieces = [[words, "words"], [axis.name, "symbol"], [rest, "words"]];
    const widths = pieces.map(([text, kind]) => this.measure(text, kind));
    let from = align === "right" ? x - widths.reduce((sum, each) => sum + each) : x;
    pieces.forEach(([text, kind], k) => {
      this.write(text, from, y, "left", kind);
      from += widths[k];
    });
  }

  setFont(kind) {
    this.context.font = kind === "symbol"
      ? `italic ${13 * this.ratio}px ${FONTS.symbol}`
      : `${12 * this.ratio}px ${FONTS.words}`;
  }

  measure(text, kind = "words") {
    this.setFont(kind);
    return this.context.measureText(text).width;
  }

  write(text, x, y, align, kind = "words") {
    this.setFont(kind);
    this.context.textAlign = align;
    this.context.fillStyle = COLOURS.ink;
    this.context.fillText(text, x, y);
  }
}

/** A test whether the next label, from … to, keeps its distance from the last one that did. */
function spacer(gap) {
  let end = -Infinity;
  return (from, to) => {
    if (from < end + gap) return false;
    end = to;
    return true;
  };
}

const ALIGNMENT = 16; // CSS pixels within which one of them usually falls on a device pixel

/** The first whole CSS pixel at or after an edge that is a whole device pixel too; else the edge itself.

    Browsers place boxes on whole CSS or on whole device pixels; where both agree nothing is resampled. */
function alignedFrom(edge, ratio) {
  for (let at = Math.ceil(edge); at < edge + ALIGNMENT; at += 1) if (isWhole(at * ratio)) return at;
  return edge;
}

/** The largest such length that is not longer than the given one. */
function alignedTo(length, ratio) {
  for (let at = Math.floor(length); at > length - ALIGNMENT; at -= 1) if (isWhole(at * ratio)) return at;
  return length;
}

function isWhole(value) {
  return Math.abs(value - Math.round(value)) < 1e-3;
}
