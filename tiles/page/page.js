"use strict";

/* The page: one canvas, the words and buttons around it, and the link in the hash. */

const element = (id) => document.getElementById(id);

class Page {
  constructor(meta) {
    const deepest = (k) => Math.max(...meta.pairs.map((pair) => pair[k]));
    this.meta = meta;
    this.recipe = meta.plate.points ? RECIPES.command : RECIPES.config;
    this.across = new Axis(meta.axes.across, deepest(0));
    this.up = new Axis(meta.axes.up, deepest(1));
    this.frame = new Frame(element("canvas"), this.across, this.up, meta.marks);
    this.layers = new Layers(meta, () => this.switched());
    this.tiles = new Tiles(meta, this.layers, this.across, this.up, () => this.redraw());
    this.sideCars = meta.kind === "plane" ? new SideCars(this.layers, this.across, this.up, () => this.redraw()) : null;
    this.pointer = null; // canvas position under the mouse or finger
    this.notice = ""; // a sentence that stands until the view changes
    this.drawing = 0; // the animation frame asked for
    this.remembering = 0; // the timer that will write the hash
    this.sized = false;
    this.showWords();
    this.listen();
    this.observe();
  }

  /* ---- drawing ---- */

  resize() {
    this.frame.resize();
    thinKey();
    if (!this.sized) this.followHash();
    this.sized = true;
    this.redraw();
  }

  redraw() {
    this.drawing ||= requestAnimationFrame(() => {
      this.drawing = 0;
      this.frame.drawInside(this.meta.background, (context, plot) => this.tiles.draw(context, plot));
      this.frame.drawAround();
      this.showReadout();
      this.showStatus();
    });
  }

  /** Values in the middle of the device pixel at a canvas position. */
  readout(x, y) {
    const { left, top, width, height } = this.frame.plot;
    const inside = (value, size) => Math.max(0, Math.min(Math.floor(value), size - 1));
    return [this.across.readout(inside(x - left, width)), this.up.readout(height - 1 - inside(y - top, height))];
  }

  showReadout() {
    const { left, top, width, height } = this.frame.plot;
    const values = this.readout(...(this.pointer || [left + width / 2, top + height / 2]));
    const lines = [this.across, this.up].map((axis, k) => {
      const line = make("span");
      const measure = axis.measure ? ` ${axis.measure}` : "";
      line.append(make("i", axis.name), ` = ${values[k].replace("-", "−")}${measure}`);
      return line;
    });
    if (this.sideCars) lines.push(...this.layers.words(this.found()));
    element("readout").replaceChildren(make("b", this.pointer ? "pointer" : "centre"), ...lines);
  }

  /** Class and values at the pointer, or at the centre once the keyboard moves the view; null where nothing is asked. */
  found() {
    const { left, top, width, height } = this.frame.plot;
    if (!this.pointer && document.activeElement !== element("canvas")) return null;
    const [x, y] = this.pointer || [left + width / 2, top + height / 2];
    const [column, row] = [Math.floor(x - left), height - 1 - Math.floor(y - top)];
    if (column < 0 || row < 0 || column >= width || row >= height) return null;
    return this.sideCars.under(this.tiles.choose().pair, column, row);
  }

  showStatus() {
    const words = this.notice || this.shownWords() + this.tileWords();
    if (element("status").textContent !== words) element("status").textContent = words;
  }

  shownWords() {
    const { asked, pair, kind } = this.tiles.choose();
    const named = ([a, u]) => `across ${a}, up ${u}`;
    const level = (axis) => String(Math.round(axis.level * 100) / 100).replace("-", "−");
    if (kind === "exact") return `Level ${named(asked)}: one tile pixel is one screen pixel.`;
    const here = `Level across ${level(this.across)}, up ${level(this.up)}`;
    if (kind === "shrunk") return `${here}: ${named(pair)} is shown, shrunk.`;
    if (kind === "none") return "No tiles of levels as coarse as these were built: zoom in.";
    return `No tiles of level ${named(asked)} were built: ${named(pair)} is shown, stretched.`;
  }

  tileWords() {
    const { pending, unreadable } = this.tiles;
    if (pending) return ` Reading ${pending} tile${pending > 1 ? "s" : ""}…`;
    return unreadable ? ` ${unreadable} tile${unreadable > 1 ? "s" : ""} could not be read.` : "";
  }

  /* ---- changing the view ---- */

  changed() {
    this.notice = "";
    this.redraw();
    clearTimeout(this.remembering);
    this.remembering = setTimeout(() => this.remember(), 150);
  }

  /** Move by device pixels. */
  move(right, upward) {
    this.across.moveBy(right);
    this.up.moveBy(upward);
    this.changed();
  }

  /** Zoom about a canvas position, or about the centre. */
  zoom(steps, axes, x, y) {
    const { left, top, height } = this.frame.plot;
    if (axes.across) this.across.zoomBy(steps, x === undefined ? undefined : x - left);
    if (axes.up) this.up.zoomBy(steps, y === undefined ? undefined : top + height - y);
    this.changed();
  }

  /** Another layer was chosen. */
  switched() {
    this.showLayer();
    this.changed();
  }

  showLayer() {
    const { shown } = this.layers;
    const { key, marks, kind } = this.meta;
    const axes = kind === "plane" ? `${this.across.name} and ${this.up.name}` : `${this.up.name} against ${this.across.name}`;
    const what = `${shown.label} ${kind === "plane" ? "over" : "of"} ${axes}`;
    element("canvas").setAttribute("aria-label", `${what}; arrows move, plus and minus zoom, Home shows everything`);
    showKey(shown, shown.key || key, Boolean(marks && Object.keys(marks).length));
    thinKey();
  }

  showWhole() {
    this.across.showWhole();
    this.up.showWhole();
    this.changed();
  }

  /** Go to the nearest built pair of levels, where one tile pixel is one device pixel. */
  showTilePixels() {
    const [a, u] = this.tiles.nearestPair();
    this.across.zoomBy(a * STEPS_PER_LEVEL - this.across.zoom);
    this.up.zoomBy(u * STEPS_PER_LEVEL - this.up.zoom);
    this.changed();
  }

  listen() {
    const actions = {
      Home: () => this.showWhole(),
      a: () => Input.choose("across"),
      u: () => Input.choose("up"),
      b: () => Input.choose("both"),
      p: () => this.showTilePixels(),
      y: () => this.copyPlate(),
      ...(this.layers.all.length > 1 ? { l: () => [this.layers.next(), this.switched()] } : {}),
    };
    new Input(element("canvas"), {
      actions,
      far: () => this.frame.css(64),
      move: (right, upward) => this.move(right, upward),
      zoom: (...how) => this.zoom(...how),
      hover: (at) => {
        this.pointer = at;
        this.redraw();
      },
    });
    const clicks = {
      in: () => this.zoom(Input.KEY_STEPS, Input.zoomed()),
      out: () => this.zoom(-Input.KEY_STEPS, Input.zoomed()),
      whole: actions.Home,
      pixels: actions.p,
      link: () => this.copyLink(),
      plate: actions.y,
      about: () => this.showAbout(),
    };
    for (const [id, action] of Object.entries(clicks)) element(id).addEventListener("click", action);
    if (this.sideCars) for (const turn of ["focus", "blur"]) element("canvas").addEventListener(turn, () => this.redraw());
    addEventListener("hashchange", () => this.followHash());
  }

  observe() {
    new ResizeObserver(() => this.resize()).observe(element("canvas").parentElement);
    const watch = () => {
      const query = matchMedia(`(resolution: ${window.devicePixelRatio}dppx)`);
      query.addEventListener("change", () => [this.resize(), watch()], { once: true });
    };
    watch();
  }

  /* ---- the link ---- */

  /** The hash of this view; none for the whole view, so that such a link fits every window. */
  hash() {
    const whole = this.across.showsWhole() && this.up.showsWhole();
    const range = whole ? "" : `across=${this.across.address()}&up=${this.up.address()}`;
    const parts = [range, this.layers.part].filter(Boolean);
    return parts.length ? `#${parts.join("&")}` : "";
  }

  remember() {
    clearTimeout(this.remembering);
    this.remembering = 0;
    if (location.hash !== this.hash()) history.replaceState(null, "", location.href.split("#")[0] + this.hash());
  }

  followHash() {
    if (location.hash === this.hash()) return;
    const parts = /^#?(?:across=([^&]*)&up=([^&]*))?(?:(?:^#|&)layer=([^&]*))?$/.exec(location.hash);
    const [across, up] = parts ? parts.slice(1, 3) : [];
    const layer = decoded(parts?.[3]) ?? this.layers.all[0].name;
    if (parts && this.layers.isKnown(layer) && (across === undefined || (Axis.isAddress(across) && Axis.isAddress(up)))) {
      this.layers.show(layer);
      this.showLayer();
      if (across === undefined) return this.showWhole();
      this.across.follow(across);
      this.up.follow(up);
      this.changed();
    } else {
      this.notice = "The view in this page's address could not be read, so the view was left as it is.";
      this.redraw();
    }
  }

  /* ---- words ---- */

  async copy(text, what) {
    const done = await toClipboard(text);
    if (!done) showText(`Copy the ${what} by hand`, text);
    this.notice = done ? `Copied: the ${what}.` : "";
    this.redraw();
  }

  /** The view as a text that draws it: a config, or a command for a tile set of points. */
  plateText() {
    const { plate, kind } = this.meta;
    const drawn = kind === "plane" ? { ...this.meta, plate: this.layers.recipe(plate) } : this.meta;
    return (plate.points ? commandText : configText)(drawn, this.across, this.up);
  }

  copyPlate() {
    return this.copy(this.plateText(), `view as ${this.recipe.what}`);
  }

  copyLink() {
    this.remember();
    return this.copy(location.href, "link to this view");
  }

  showWords() {
    const { title, formula, kind } = this.meta;
    document.body.classList.toggle("plane", kind === "plane");
    document.body.style.setProperty("--half", Math.ceil((2 + this.layers.all.length) / 2));
    document.title = element("title").textContent = title;
    element("formula").textContent = formula.join(";  ");
    const button = element("plate");
    button.ariaLabel = button.querySelector(".long").textContent = this.recipe.button;
    button.querySelector(".short").textContent = this.recipe.short;
    button.title = `Copy this view as ${this.recipe.what} (Y)`;
    this.showLayer();
  }

  showAbout() {
    const { title, note, family, formula, certificate } = this.meta;
    const list = make("dl");
    const keys = [...KEYS, ...(this.layers.all.length > 1 ? [LAYER_KEY] : []), ["Y", `copy this view as ${this.recipe.what}`]];
    for (const [key, words] of keys) list.append(make("dt", key), make("dd", words));
    showDialog(title, [
      ...(note ? [make("p", note)] : []),
      ...(formula.length ? [make("h3", `Formula: ${family}`), make("pre", formula.join("\n"))] : []),
      ...(this.sideCars ? [make("h3", "Coarser levels"), make("p", COARSER)] : []),
      make("h3", "Keys"),
      list,
      make("h3", "Certificate"),
      make("pre", JSON.stringify(certificate, null, 2)),
    ]);
  }

  /** For tests, read only. Lengths are device pixels of the canvas, numbers are exact texts "num/den".

      ready()        the view is drawn with all its tiles and the hash is up to date
      view()         of both axes: level, address as in the hash, low and high of the visible part, and the window's
                     lower edge and pixel size as shares of the whole axis
      plot()         {left, top, width, height} of the box that the tiles fill
      shown()        {asked, pair, kind} as Tiles.choose
      readout(x, y)  texts of the values at a canvas position
      layer()        name of the layer shown
      plateText()    what 'Copy YAML' or 'Copy command' copies */
  hook() {
    const fraction = ({ num, den }) => `${num}/${den}`;
    const described = (axis) => ({
      level: axis.level,
      address: axis.address(),
      low: fraction(axis.valueAt(axis.window()[0])),
      high: fraction(axis.valueAt(axis.window()[1])),
      start: `${axis.start()}/${axis.full}`,
      pixel: `${axis.unit()}/${axis.full}`,
    });
    return Object.freeze({
      ready: () => this.sized && !this.drawing && !this.remembering && this.tiles.pending === 0 && !this.sideCars?.pending,
      view: () => ({ across: described(this.across), up: described(this.up) }),
      plot: () => ({ ...this.frame.plot }),
      shown: () => this.tiles.choose(),
      readout: (x, y) => this.readout(x, y),
      layer: () => this.layers.shown.name,
      plateText: () => this.plateText(),
    });
  }
}

const KEYS = [
  ["arrows", "move; with Shift by one screen pixel"],
  ["+ and −", "zoom by half a level; with Alt up only"],
  ["A, U, B", "zoom across only, up only, both axes"],
  ["wheel", "zoom about the pointer; with Shift across only, with Alt up only"],
  ["Home", "whole view"],
  ["P", "nearest levels at which one tile pixel is one screen pixel"],
];
const LAYER_KEY = ["L", "next layer"];
const COARSER =
  "At the deepest level a tile pixel is one computed point. At coarser levels it shows the class of most of its " +
  "points (of equally frequent ones that of the shortest period or lowest number) and the mean of their values.";
const RECIPES = {
  config: { button: "Copy YAML", short: "YAML", what: "YAML for a plate" },
  command: { button: "Copy command", short: "Shell", what: "a command line that draws it" },
};

function make(tag, text = "") {
  const made = document.createElement(tag);
  made.textContent = text;
  return made;
}

function showDialog(title, content) {
  element("record-title").textContent = title;
  element("record-body").replaceChildren(...content);
  element("record").showModal();
}

function showText(title, text) {
  const area = make("textarea", text);
  area.readOnly = true;
  showDialog(title, [area]);
  area.select();
}

/** A part of an address as text; undefined where there is none, empty where it makes no sense. */
function decoded(part) {
  try {
    return part === undefined ? undefined : decodeURIComponent(part);
  } catch (problem) {
    if (!(problem instanceof URIError)) throw problem;
    return "";
  }
}

function fail(sentence) {
  const message = make("p", sentence);
  message.className = "failed";
  message.setAttribute("role", "alert");
  document.body.replaceChildren(message);
}

if (!window.ATLAS_META) {
  const remedy = "copy the whole site folder, or build it again with 'atlas site'";
  fail(`The file meta.js is missing beside this page: ${remedy}.`);
} else if (window.ATLAS_META.version !== 1) {
  const found = window.ATLAS_META.version;
  fail(`This page reads version 1 of meta.js, but found version ${found}: build the site again with 'atlas site'.`);
} else {
  window.atlasPage = new Page(window.ATLAS_META).hook();
}
