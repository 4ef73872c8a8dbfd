"use strict";

/* The view as a config in YAML or as a command, and the clipboard. */

const TYPED = /^(yes|no|true|false|on|off|null|[0-9]+-[0-9]+-[0-9].*)$/i; // what readers of YAML take for no text

/** A printable text as a YAML scalar: plain where that is safe, else in double quotes. */
function scalar(value) {
  const text = String(value);
  const words = /^[A-Za-z0-9_.+/][A-Za-z0-9_.+/*-]*( [A-Za-z0-9_.+/(][A-Za-z0-9_.+/*()-]*)*$/;
  const negative = /^-[0-9.][0-9./e*pi+-]*$/;
  return (words.test(text) && !TYPED.test(text)) || negative.test(text) ? text : JSON.stringify(text);
}

/** Texts, lists and mappings in YAML's flow form. */
function flow(value) {
  if (Array.isArray(value)) return `[${value.map(flow).join(", ")}]`;
  if (value === null || typeof value !== "object") return scalar(value);
  return `{${Object.entries(value).map(([key, each]) => `${scalar(key)}: ${flow(each)}`).join(", ")}}`;
}

/** A section of a config: each entry a block of keys whose values are in flow form. */
function section(name, entries) {
  const line = ([key, value]) => `    ${scalar(key)}: ${flow(value)}\n`;
  const block = ([key, settings]) => `  ${scalar(key)}:\n${Object.entries(settings).map(line).join("")}`;
  return `${name}:\n${Object.entries(entries).map(block).join("")}`;
}

/** An axis with the visible interval as a config writes it; `given` is what the tile set says of the axis. */
function writtenAxis(axis, given) {
  const [low, high] = axis.window().map((at) => axis.written(at));
  if (axis.logarithm === null && !given) return [axis.name, low, high];
  return { name: axis.name, low, high, ...(axis.logarithm === null ? {} : { scale: "log" }), ...given };
}

/** The visible part of the view as a config: the families that it needs, and one plate. */
function configText({ plate, families }, across, up) {
  const { across: ofAcross, up: ofUp, ...others } = plate;
  const view = { ...others, across: writtenAxis(across, ofAcross), up: writtenAxis(up, ofUp) };
  const needed = Object.keys(families || {}).length ? section("families", families) : "";
  return needed + section("plates", { view });
}

/** A text as one word of a POSIX shell. */
function word(text) {
  return /^[A-Za-z0-9_.,:=/+-]+$/.test(text) ? text : `'${text.replaceAll("'", "'\\''")}'`;
}

/** The visible part of a view of points as a command that draws it; the file of points must be at hand. */
function commandText({ plate }, across, up) {
  const { points, across: ofAcross, up: ofUp, ...others } = plate;
  const words = ["atlas", "bin", word(points.startsWith("-") ? `./${points}` : points)];
  const option = (name, value) => words.push(`--${name}`, word(value));
  for (const [name, axis, given] of [["across", across, ofAcross], ["up", up, ofUp]]) {
    const [low, high] = axis.window().map((at) => axis.written(at));
    option(name, `${axis.name}=${low}:${high}`);
    if (axis.logarithm !== null) option(`scale-${name}`, "log");
    if (given?.label) option(`label-${name}`, given.label);
  }
  for (const key of ["shading", "palette", "background"]) if (others[key]) option(key, others[key]);
  return `${words.join(" ")} --out view.png\n`;
}

/** Put a text on the clipboard; false when the browser does not allow it. */
async function toClipboard(text) {
  if (window.isSecureContext && navigator.clipboard) {
    try {
      await navigator.clipboard.writeText(text);
      return true;
    } catch (problem) {
      if (!(problem instanceof DOMException)) throw problem; // refused: try the older way
    }
  }
  const area = make("textarea", text);
  area.style.cssText = "position: fixed; left: -100vw";
  const focused = document.activeElement;
  document.body.append(area);
  area.select();
  const done = document.execCommand("copy");
  area.remove();
  focused?.focus();
  return done;
}
