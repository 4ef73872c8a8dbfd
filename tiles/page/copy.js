"use strict";

/* The view as a plate of a config, in YAML, and the clipboard. */

/** A text as a YAML scalar: plain where that is safe, else in double quotes. */
function scalar(value) {
  const text = String(value);
  const words = /^[A-Za-z0-9_.+/][A-Za-z0-9_.+/*-]*( [A-Za-z0-9_.+/(][A-Za-z0-9_.+/*()-]*)*$/;
  const negative = /^-[0-9.][0-9./e*pi+-]*$/;
  return words.test(text) || negative.test(text) ? text : JSON.stringify(text);
}

/** Texts, lists and mappings in YAML's flow form. */
function flow(value) {
  if (Array.isArray(value)) return `[${value.map(flow).join(", ")}]`;
  if (value === null || typeof value !== "object") return scalar(value);
  return `{${Object.entries(value).map(([key, each]) => `${scalar(key)}: ${flow(each)}`).join(", ")}}`;
}

/** An axis with the visible interval as a config writes it; `given` is how the config wrote the whole axis. */
function writtenAxis(axis, given) {
  const [low, high] = axis.window().map((at) => axis.written(at));
  if (given && !Array.isArray(given)) return { ...given, name: axis.name, low, high };
  return axis.logarithm === null ? [axis.name, low, high] : { name: axis.name, low, high, scale: "log" };
}

/** The visible part of the view as a plate: `plates:` with one entry of the tile set's own settings. */
function plateText(settings, across, up) {
  const { across: wholeAcross, up: wholeUp, ...others } = settings;
  const plate = { ...others, across: writtenAxis(across, wholeAcross), up: writtenAxis(up, wholeUp) };
  const lines = Object.entries(plate).map(([key, value]) => `    ${scalar(key)}: ${flow(value)}\n`);
  return `plates:\n  view:\n${lines.join("")}`;
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
