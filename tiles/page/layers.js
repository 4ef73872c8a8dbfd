"use strict";

/* The layers of a tile set: which one is shown, its legend or colour key, and the classes and values under the
   pointer. A tile set of densities has one layer and no switch. */

const PLACEHOLDER = "…"; // until a side-car script arrives
const RAISED = { "-": "⁻", ...Object.fromEntries([..."⁰¹²³⁴⁵⁶⁷⁸⁹"].map((sign, digit) => [digit, sign])) };

class Layers {
  /** `changed` is called when the reader chooses another layer. */
  constructor(meta, changed) {
    this.all = meta.layers;
    this.shown = this.all[0];
    this.chooser = element("layer");
    for (const { name, label } of this.all) {
      const option = make("option", label);
      option.value = name;
      this.chooser.append(option);
    }
    element("layers").hidden = this.all.length < 2;
    this.chooser.addEventListener("change", () => {
      this.show(this.chooser.value);
      changed();
    });
  }

  isKnown(name) {
    return this.all.some((layer) => layer.name === name);
  }

  show(name) {
    this.shown = this.all.find((layer) => layer.name === name);
    this.chooser.value = name;
  }

  next() {
    this.show(this.all[(this.all.indexOf(this.shown) + 1) % this.all.length].name);
  }

  /** This layer's part of a link; none for the first, so that links stay short. */
  get part() {
    return this.shown === this.all[0] ? "" : `layer=${encodeURIComponent(this.shown.name)}`;
  }

  /** What a config needs beside the axes to draw this layer. */
  recipe(plate) {
    const { palette: _, ...others } = plate;
    return { ...others, draw: this.shown.name, ...(this.shown.palette ? { palette: this.shown.palette } : {}) };
  }

  /** The words under the pointer: the class, and every layer of values; `found` as SideCars.under gives it. */
  words(found) {
    const lines = [];
    for (const layer of this.all) {
      const line = make("span");
      if (layer.kind === "classes") {
        const entry = layer.legend.find((each) => each.class === found?.class);
        if (entry) line.append(swatch(entry.colour));
        line.append(entry ? entry.label : `${layer.label} = ${vacancy(found, String(found?.class))}`);
      } else {
        const value = found?.values?.[this.valueLayers.indexOf(layer)];
        const unit = layer.unit ? ` ${layer.unit}` : "";
        const number = Number.isNaN(value) ? "none" : vacancy(found, value === undefined ? "" : numeral(value) + unit);
        line.append(`${layer.label} = ${number}`);
      }
      lines.push(line);
    }
    return lines;
  }

  get valueLayers() {
    return this.all.filter((layer) => layer.kind === "values");
  }
}

/** What stands for a class or a value where there is none to be told; else the words. */
function vacancy(found, words) {
  if (!found) return "–";
  return { pending: PLACEHOLDER, unreadable: "not readable" }[found.state] || words;
}

/** A number of four significant digits. */
function numeral(value) {
  const size = Math.abs(value);
  if (size === 0 || (size >= 1e-4 && size < 1e6)) return String(Number(value.toPrecision(4))).replace("-", "−");
  const [factor, power] = value.toExponential(3).split("e");
  const raised = [...String(Number(power))].map((sign) => RAISED[sign]).join("");
  return `${String(Number(factor)).replace("-", "−")}×10${raised}`;
}

function swatch(colour) {
  const patch = make("i");
  patch.className = "swatch";
  patch.style.background = colour;
  return patch;
}

/** The legend of a layer of classes, or the colour bar of any other with its labels. */
function showKey(layer, key, marked) {
  element("key").classList.toggle("classes", layer.kind === "classes");
  for (const id of ["caption", "scale", "legend"]) element(id).replaceChildren();
  element("bar").hidden = element("scale").hidden = layer.kind === "classes";
  element("legend").hidden = layer.kind !== "classes";
  if (layer.kind === "classes") showLegend(layer);
  else showBar(key, { ...(marked ? { "unsettled columns": "mark" } : {}) }, layer.none);
  element("key").hidden = false;
}

function showLegend({ legend }) {
  for (const { label, colour, share } of legend) {
    const entry = make("li");
    entry.title = `${label}: ${numeral(100 * share)} % of the view`;
    entry.append(swatch(colour), label);
    element("legend").append(entry);
  }
}

function showBar({ caption, colours, labels }, marks, none) {
  element("caption").append(make("span", caption));
  for (const [words, name] of Object.entries(marks)) {
    const sign = make("span");
    sign.className = name;
    sign.append(make("i"), words);
    element("caption").append(sign);
  }
  if (none) {
    const sign = make("span");
    sign.append(swatch(none), "no value");
    element("caption").append(sign);
  }
  element("bar").style.background = `linear-gradient(to right, ${colours.join(", ")})`;
  for (const [share, text] of labels) {
    const label = make("span", text);
    label.style.left = `${100 * share}%`;
    label.style.transform = `translateX(${-100 * share}%)`;
    element("scale").append(label);
  }
}

/** Hide the labels of the colour bar that would touch the one before. */
function thinKey() {
  const fits = spacer(6);
  for (const label of element("scale").children) {
    const { left, right } = label.getBoundingClientRect();
    label.style.visibility = fits(left, right) ? "" : "hidden";
  }
}
